//! The page of a pack: what it says, that nothing of a user's text becomes markup, and how it behaves in a browser.
//!
//! The browser is Debian's `chromium`, driven by `playwright-core` and judged for accessibility by `axe-core`, both from
//! the npm registry in the versions of `tests/browser/package-lock.json`, put into `target/browser` by
//! `tests/browser/install`. Without them these tests say what they skip, and pass; with `FIXABILITY_REQUIRE_READERS=1` they
//! fail.

use std::fs;
use std::path::{Path, PathBuf};
use std::process::Command;

use scraper::{Html, Selector};
use serde_json::Value;

use crate::support::outside::left_out;
use crate::support::program::{PROGRAM, Workplace, project};

/// A text that would act if it became markup, in three ways of ending what surrounds it.
const HOSTILE: [&str; 3] = [
    "<script>alert(1)</script>",
    "\"><img src=x onerror=alert(2)>",
    "</script><svg onload=alert(3)>'--><!--",
];

/// A small dive with text of its own for the dive, a line and landmarks.
fn hostile_place() -> Workplace {
    let place = Workplace::with_small_dive();
    let text = |name: &str| String::from_utf8(place.bytes(name)).unwrap();
    let quoted = |text: &str| format!("\"{}\"", text.replace('"', "\"\""));
    let coarse =
        "[area]\ncell_m = 100\nheadings = 4\nlongest_run_m = 300\n[remap]\ncell_m = 100\ngain_regions = 1\n";
    let dive =
        text("dive.toml").replace("name = \"Small dive\"", &format!("name = '''{}'''", HOSTILE[0])) + coarse;
    let lines = text("lines.csv").replace("East,", &format!("{},", quoted(HOSTILE[1])));
    let mut landmarks = String::new();
    for (number, line) in text("landmarks.csv").lines().enumerate() {
        match (number, line.split_once(',')) {
            (1.., Some((id, rest))) => {
                landmarks += &format!("{},{rest}\n", quoted(&format!("{id}{}", HOSTILE[number % 3])));
            }
            _ => landmarks += &format!("{line}\n"),
        }
    }
    place.write("dive.toml", &dive).write("lines.csv", &lines).write("landmarks.csv", &landmarks)
}

fn texts(page: &Html, selector: &str) -> Vec<String> {
    let selector = Selector::parse(selector).expect("a selector");
    page.select(&selector).map(|element| element.text().collect::<String>()).collect()
}

fn count(page: &Html, selector: &str) -> usize {
    page.select(&Selector::parse(selector).expect("a selector")).count()
}

#[test]
fn text_of_users_stays_text() {
    let place = hostile_place();
    place.run("brief dive.toml --out pack").expect(0);
    let bytes = place.bytes("pack/index.html");
    let page = Html::parse_document(std::str::from_utf8(&bytes).expect("UTF-8"));
    assert_eq!(page.errors.len(), 0, "the page is well-formed: {:?}", page.errors);
    assert_eq!(texts(&page, "h1"), [HOSTILE[0]]);
    assert_eq!(texts(&page, "title"), [format!("Briefing: {}", HOSTILE[0])]);
    assert!(texts(&page, "#ranking tbody th").contains(&HOSTILE[1].to_owned()));
    assert!(
        texts(&page, "#look-alikes td").iter().any(|cell| HOSTILE.iter().any(|text| cell.contains(text)))
    );
    // The data, and the page's own script; no handler, no picture from elsewhere, nothing that fetches.
    assert_eq!(count(&page, "script"), 2);
    assert_eq!(count(&page, "link, iframe, object, embed, base, form, video, audio, foreignObject"), 0);
    let every = Selector::parse("*").unwrap();
    for element in page.select(&every) {
        for (name, value) in element.value().attrs() {
            assert!(!name.starts_with("on") && name != "style", "{name}={value}");
            let fetches = ["src", "srcset", "href", "data", "poster", "action"].contains(&name);
            let is_inside = value.starts_with('#') || value.starts_with("data:image/png;base64,");
            let is_sibling = element.value().name() == "a" && !value.contains([':', '/', '<', '"']);
            assert!(!fetches || is_inside || is_sibling, "{name}={value}");
        }
    }
    // The data can be read back, with the names in them.
    let data: Value = serde_json::from_str(&texts(&page, "script#dives")[0]).expect("JSON");
    assert_eq!(data["dives"].as_array().map(Vec::len), Some(2));
    let labels = Selector::parse(".stepper svg").unwrap();
    let label = page.select(&labels).next().and_then(|svg| svg.attr("aria-label")).expect("a label");
    assert!(label.contains(HOSTILE[1]), "{label}");
}

/// Style and script run only by their fingerprints, which must be those of the page; nothing may be fetched.
#[test]
fn the_policy_allows_the_page_itself_and_nothing_else() {
    use base64::Engine as _;
    use base64::engine::general_purpose::STANDARD;
    use sha2::{Digest, Sha256};
    let place = hostile_place();
    place.run("brief dive.toml --out pack").expect(0);
    let text = String::from_utf8(place.bytes("pack/index.html")).expect("UTF-8");
    let page = Html::parse_document(&text);
    let selector = Selector::parse("meta[http-equiv='Content-Security-Policy']").unwrap();
    let policy =
        page.select(&selector).next().and_then(|meta| meta.attr("content")).expect("a policy").to_owned();
    assert!(
        policy.starts_with("default-src 'none';") && !policy.contains("unsafe") && !policy.contains('*'),
        "{policy}"
    );
    for (kind, selector) in [("style-src", "style"), ("script-src", "script:not([type])")] {
        let inner = texts(&page, selector);
        assert_eq!(inner.len(), 1);
        let hash = STANDARD.encode(Sha256::digest(inner[0].as_bytes()));
        assert!(policy.contains(&format!("{kind} 'sha256-{hash}'")), "{kind}");
    }
}

#[test]
fn the_page_tells_in_order_and_labels_what_is_guaranteed() {
    let place = hostile_place();
    place.run("brief dive.toml --out pack").expect(0);
    let page = Html::parse_document(&String::from_utf8(place.bytes("pack/index.html")).unwrap());
    let selector = Selector::parse("main > section").unwrap();
    let order: Vec<&str> = page.select(&selector).filter_map(|section| section.attr("id")).collect();
    let wanted = [
        "verdict",
        "ranking",
        "charts",
        "dives-section",
        "look-alikes",
        "remap",
        "suggest",
        "sensitivity",
        "assumptions",
        "cautions",
        "provenance",
    ];
    let mut at = 0;
    for id in wanted {
        at += order[at..].iter().position(|known| *known == id).unwrap_or_else(|| panic!("{id}: {order:?}"));
    }
    // The column groups of the ranking: nothing guaranteed and estimated under one head.
    let groups = texts(&page, "#ranking thead th[scope=colgroup]");
    assert_eq!(groups.len(), 2);
    assert!(groups[0].contains("guaranteed") && !groups[0].contains("estimated"), "{groups:?}");
    assert!(groups[1].contains("estimated") && !groups[1].contains("guaranteed"), "{groups:?}");
    assert_eq!(count(&page, "table"), count(&page, "table > caption"));
    assert_eq!(count(&page, "th"), count(&page, "th[scope]"));
    assert_eq!(count(&page, "table"), count(&page, ".scroll[tabindex='0'][role=region][aria-label] > table"));
    assert_eq!(count(&page, "img"), count(&page, "img[alt][width][height]"));
    assert_eq!(count(&page, "html[lang=en]"), 1);
    // What the pack holds is what the page says it holds.
    let listed = texts(&page, "#provenance table:last-of-type tbody a");
    let mut there = place.names("pack");
    there.retain(|name| name != "index.html");
    let mut of_page: Vec<String> = listed.into_iter().filter(|name| there.contains(name)).collect();
    of_page.sort();
    assert_eq!(of_page, there);
    let about = texts(&page, "#provenance td.words");
    assert!(about.iter().all(|text| !text.is_empty()), "every file is described: {about:?}");
    // The inputs with their fingerprints, in full.
    assert_eq!(texts(&page, "#provenance code").iter().filter(|hash| hash.len() == 64).count(), 3);
    assert_eq!(texts(&page, ".caution").len(), 2);
}

/// Folder of `npm ci` and the browser; none when something is missing.
fn browser() -> Option<PathBuf> {
    let modules = target_folder().join("browser");
    let has_chromium =
        Command::new("chromium").arg("--version").output().is_ok_and(|ran| ran.status.success());
    let has_node = Command::new("node").arg("--version").output().is_ok_and(|ran| ran.status.success());
    let has_modules =
        ["playwright-core", "axe-core"].iter().all(|name| modules.join("node_modules").join(name).is_dir());
    for (there, what) in [
        (has_chromium, "chromium"),
        (has_node, "node"),
        (has_modules, "playwright-core and axe-core (tests/browser/install)"),
    ] {
        if !there {
            left_out(
                what,
                "the page in a browser: console, requests, slider, accessibility, narrow screen, print",
            );
            return None;
        }
    }
    Some(modules)
}

/// Where cargo builds: the program under test stands in `target/release`.
fn target_folder() -> PathBuf {
    Path::new(PROGRAM).ancestors().nth(2).expect("target/PROFILE/PROGRAM").to_owned()
}

/// What the check script found on a page.
fn look(modules: &Path, page: &Path, pictures: &Path) -> Value {
    fs::create_dir_all(pictures).unwrap();
    let ran = Command::new("node")
        .arg(project("tests/browser/check.mjs"))
        .args([page, pictures, modules])
        .output()
        .expect("node runs");
    assert!(ran.status.success(), "{}", String::from_utf8_lossy(&ran.stderr));
    serde_json::from_slice(&ran.stdout).expect("the facts are JSON")
}

/// What must hold of every page.
fn judge(facts: &Value, page: &Path) {
    let empty = |key: &str| assert_eq!(facts[key].as_array().map(Vec::len), Some(0), "{key}: {}", facts[key]);
    empty("console");
    empty("errors");
    empty("dialogs");
    let requests = facts["requests"].as_array().expect("requests");
    let own = format!("file://{}", page.display());
    assert!(!requests.is_empty() && requests.iter().all(|request| *request == own.as_str()), "{requests:?}");
    assert_eq!(facts["handlers"], 0);
    for width in ["wide", "narrow"] {
        let findings = &facts[width];
        assert!(findings["passes"].as_u64() > Some(20), "the accessibility run did run: {findings}");
        for violation in findings["violations"].as_array().expect("violations") {
            let impact = violation["impact"].as_str();
            assert!(!matches!(impact, Some("serious" | "critical")), "{width}: {violation}");
        }
    }
    assert_eq!(facts["overflow"], 0, "the page scrolls sideways at 390 px");
    assert_eq!(facts["firstStop"]["text"], "To the verdict");
    assert_ne!(facts["firstStop"]["outlineStyle"], "none", "the focus is visible");
    let tables = facts["tables"].as_array().expect("tables");
    assert!(tables.len() >= 5, "{tables:?}");
    assert!(tables.iter().all(|table| table["caption"] != "" && table["loose"] == 0), "{tables:?}");
    let pictures = facts["pictures"].as_array().expect("pictures");
    assert!(pictures.len() >= 5);
    assert!(pictures.iter().all(|picture| picture["loaded"] == true && picture["alt"] != ""), "{pictures:?}");
    // The slider, by keyboard alone.
    let (first, after) = (&facts["atFirst"], &facts["afterArrow"]);
    for key in ["live", "value", "cross"] {
        assert_ne!(first[key], after[key], "{key}");
    }
    assert_eq!(facts["pictureChanged"], true);
    assert_eq!(facts["afterBack"], *first, "the button steps back");
    let events = first["events"].as_u64().expect("a count");
    let last = facts["atLast"]["live"].as_str().expect("words");
    assert!(last.starts_with(&format!("Detection {events} of {events},")), "{last}");
    assert_eq!(facts["afterOn"], facts["atLast"], "there is nothing after the last");
    // Paper and browsers without script: small frames in place of the slider.
    assert_eq!(facts["printed"]["steppers"], 0);
    assert!(facts["printed"]["frames"].as_u64() > Some(3));
    assert_eq!(facts["withoutScript"], serde_json::json!({ "steppers": false, "frames": true }));
}

/// Screenshots go to `FIXABILITY_PICTURES`, for the eye, where that is set.
fn pictures(place: &Workplace, name: &str) -> PathBuf {
    std::env::var_os("FIXABILITY_PICTURES")
        .map_or_else(|| place.path("pictures"), |folder| PathBuf::from(folder).join(name))
}

#[test]
fn hostile_names_do_nothing_in_a_browser() {
    let Some(modules) = browser() else { return };
    let place = hostile_place();
    place.run("brief dive.toml --out pack").expect(0);
    let page = place.path("pack/index.html");
    let facts = look(&modules, &page, &pictures(&place, "hostile"));
    judge(&facts, &page);
    assert_eq!(facts["heading"], HOSTILE[0]);
    let text = facts["text"].as_str().expect("text");
    for hostile in HOSTILE {
        assert!(text.contains(hostile), "{hostile} is shown as text");
    }
    for (element, most) in [("script", 2), ("iframe", 0)] {
        assert!(facts["elements"][element].as_u64().unwrap_or(0) <= most, "{element}");
    }
}

#[test]
fn the_page_of_the_demo_in_a_browser() {
    let Some(modules) = browser() else { return };
    let place = Workplace::new();
    let bytes = crate::readme::demo_pack("index.html");
    assert!(bytes.len() < 5_000_000, "{} bytes", bytes.len());
    let page = place.path("index.html");
    fs::write(&page, bytes).unwrap();
    let facts = look(&modules, &page, &pictures(&place, "demo"));
    judge(&facts, &page);
    assert_ne!(facts["atFirst"]["cells"], facts["afterArrow"]["cells"]);
    assert_eq!(facts["steppers"], 4);
}
