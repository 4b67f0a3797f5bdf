// Loads a page from disk in headless Chromium, uses it as a reader would, and prints what it found as JSON.
//
//   node check.mjs PAGE PICTURES MODULES
//
// PAGE: the HTML file. PICTURES: folder for screenshots and the printed page. MODULES: the folder in which `npm ci` was run
// with the package.json beside this file. The judging is done by tests/suite/page.rs.

import { mkdtempSync, readFileSync, rmSync } from "node:fs";
import { createRequire } from "node:module";
import { tmpdir } from "node:os";
import { join, resolve } from "node:path";
import { pathToFileURL } from "node:url";

const [pageFile, pictures, modules] = process.argv.slice(2).map((path) => resolve(path));
const require = createRequire(join(modules, "package.json"));
const { chromium } = require("playwright-core");
const axe = readFileSync(require.resolve("axe-core/axe.min.js"), "utf8");
const address = pathToFileURL(pageFile).href;

const facts = { console: [], errors: [], requests: [], dialogs: [] };
const profile = mkdtempSync(join(tmpdir(), "fixability-browser-"));

const open = async (options) => {
  const context = await chromium.launchPersistentContext(profile, {
    executablePath: process.env.CHROMIUM ?? "/usr/bin/chromium",
    headless: true,
    args: [
      "--no-sandbox", "--disable-gpu", "--disable-quic", "--no-first-run", "--disable-background-networking",
      "--disable-component-update", "--disable-sync", "--disable-dev-shm-usage",
    ],
    ...options,
  });
  const page = context.pages()[0] ?? (await context.newPage());
  page.on("console", (message) => facts.console.push(`${message.type()}: ${message.text()}`));
  page.on("pageerror", (error) => facts.errors.push(String(error)));
  page.on("dialog", (dialog) => { facts.dialogs.push(dialog.message()); dialog.dismiss(); });
  context.on("request", (request) => facts.requests.push(request.url()));
  await page.goto(address);
  return { context, page };
};

const findings = async (page) => {
  await page.evaluate(axe);
  const run = await page.evaluate(() => globalThis.axe.run());
  const short = (list) => list.map(({ id, impact, help, nodes }) => ({ id, impact, help, nodes: nodes.map((n) => n.html.slice(0, 200)) }));
  return { violations: short(run.violations), passes: run.passes.length };
};

const state = (page) => page.evaluate(() => {
  const dive = document.querySelector("article.dive");
  return {
    live: dive.querySelector(".live").textContent,
    value: dive.querySelector("input").getAttribute("aria-valuetext"),
    cells: dive.querySelector(".stepper .whole .cells").getAttribute("d"),
    cross: dive.querySelector(".stepper .whole .cross").getAttribute("d"),
    closeUp: dive.querySelector(".stepper .close").getAttribute("viewBox"),
    events: Number(dive.querySelector("input").max) + 1,
  };
});
const shown = (page, selector) => page.evaluate((selector) =>
  [...document.querySelectorAll(selector)].filter((element) => element.checkVisibility()).length, selector);
// Elements of the body that stick out of the window although nothing around them scrolls.
const overflow = (page) => page.evaluate(() => document.documentElement.scrollWidth - document.documentElement.clientWidth);

try {
  {
    const { context, page } = await open({ viewport: { width: 1280, height: 900 } });
    facts.title = await page.title();
    facts.heading = await page.textContent("h1");
    facts.text = await page.evaluate(() => document.body.innerText);
    facts.elements = await page.evaluate(() => {
      const count = {};
      for (const element of document.querySelectorAll("*")) count[element.localName] = (count[element.localName] ?? 0) + 1;
      return count;
    });
    facts.handlers = await page.evaluate(() =>
      [...document.querySelectorAll("*")].filter((e) => [...e.attributes].some((a) => a.name.startsWith("on"))).length);
    facts.tables = await page.evaluate(() => [...document.querySelectorAll("table")].map((table) => ({
      caption: table.caption?.textContent ?? "", rows: table.rows.length,
      loose: [...table.querySelectorAll("th")].filter((th) => !th.scope).length,
    })));
    facts.pictures = await page.evaluate(() => [...document.images].map((image) => ({
      alt: image.alt, loaded: image.complete && image.naturalWidth > 0, width: image.clientWidth,
    })));
    await page.screenshot({ path: join(pictures, "page-1280.png"), fullPage: true });
    await page.keyboard.press("Tab");
    facts.firstStop = await page.evaluate(() => {
      const { outlineStyle, outlineWidth } = getComputedStyle(document.activeElement);
      return { text: document.activeElement.textContent, outlineStyle, outlineWidth };
    });
    const range = page.locator("article.dive input").first();
    if (await range.count()) {
      facts.steppers = await shown(page, ".stepper");
      const picture = page.locator("article.dive .stepper svg.whole").first();
      facts.atFirst = await state(page);
      const before = await picture.screenshot();
      await range.focus();
      await page.keyboard.press("ArrowRight");
      facts.afterArrow = await state(page);
      facts.pictureChanged = !before.equals(await picture.screenshot());
      await page.keyboard.press("Tab");
      await page.keyboard.press("Enter");
      facts.afterBack = await state(page);
      await range.focus();
      await page.keyboard.press("End");
      facts.atLast = await state(page);
      await page.locator("article.dive .on").first().click();
      facts.afterOn = await state(page);
      await page.locator("article.dive").first().screenshot({ path: join(pictures, "stepper.png") });
    }
    facts.wide = await findings(page);
    await page.emulateMedia({ media: "print" });
    facts.printed = { steppers: await shown(page, ".stepper"), frames: await shown(page, ".frames li") };
    await page.setViewportSize({ width: 718, height: 1000 });
    await page.screenshot({ path: join(pictures, "page-print.png"), fullPage: true });
    await page.pdf({ path: join(pictures, "page.pdf"), preferCSSPageSize: true });
    await context.close();
  }
  {
    const { context, page } = await open({ viewport: { width: 390, height: 844 } });
    facts.overflow = await overflow(page);
    await page.screenshot({ path: join(pictures, "page-390.png"), fullPage: true });
    facts.narrow = await findings(page);
    await context.close();
  }
  {
    const { context, page } = await open({ viewport: { width: 1280, height: 900 }, javaScriptEnabled: false });
    facts.withoutScript = {
      steppers: await page.locator(".stepper").first().isVisible().catch(() => false),
      frames: await page.locator(".frames li").first().isVisible().catch(() => false),
    };
    await context.close();
  }
} finally {
  rmSync(profile, { recursive: true, force: true });
}
process.stdout.write(`${JSON.stringify(facts)}\n`);
