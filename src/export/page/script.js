"use strict";
// Steps through the dives. Everything shown stands in the page already; this exchanges paths and words.
(() => {
  const data = JSON.parse(document.getElementById("dives").textContent);
  const cross = ([x, y], arm) => {
    const gap = Math.trunc(arm / 3), length = arm - gap;
    return `M${x - arm} ${y}h${length}M${x + gap} ${y}h${length}M${x} ${y - arm}v${length}M${x} ${y + gap}v${length}`;
  };
  for (const article of document.querySelectorAll("article.dive")) {
    const events = data.dives[Number(article.dataset.dive)].events;
    const range = article.querySelector("input");
    if (!range) continue;
    const live = article.querySelector(".live");
    const whole = article.querySelector(".stepper svg.whole");
    const close = article.querySelector(".stepper svg.close");
    const name = article.querySelector("h3").textContent;
    const put = (svg, part, path) => svg.querySelector(part).setAttribute("d", path);
    const show = () => {
      const event = events[Number(range.value)];
      live.textContent = event.text;
      range.setAttribute("aria-valuetext", event.short);
      for (const svg of [whole, close]) {
        svg.setAttribute("aria-label", `${name}: ${event.short}`);
        put(svg, ".cells", event.cells);
      }
      put(whole, ".marks", event.marks);
      put(whole, ".marks-in", event.marks);
      put(whole, ".cross", cross(event.truth, Math.trunc(data.width / 40)));
      put(close, ".cross", cross(event.truth, Math.trunc(data.close / 40)));
      const half = Math.trunc(data.close / 2);
      const [x, y] = event.truth;
      close.setAttribute("viewBox", `${x - half} ${y - half} ${data.close} ${data.close}`);
    };
    const step = (by) => {
      const to = Number(range.value) + by;
      if (to < 0 || to >= events.length) return;
      range.value = String(to);
      show();
    };
    range.addEventListener("input", show);
    article.querySelector(".back").addEventListener("click", () => step(-1));
    article.querySelector(".on").addEventListener("click", () => step(1));
    // A browser may keep the place of the slider over a reload.
    show();
  }
  document.documentElement.classList.add("scripted");
})();
