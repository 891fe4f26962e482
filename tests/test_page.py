"""The page in a real browser: values are those of the results, and nothing leaves it."""

from __future__ import annotations

import copy
import hashlib
import json
import re
import shutil
from collections.abc import Callable, Iterator
from importlib.resources import files
from pathlib import Path
from typing import Any

import pytest
from declared_study import TEXT

from thermo_pp.output.doubt import doubt_keys
from thermo_pp.output.json_text import json_text, plain
from thermo_pp.output.page import page_text, write_page
from thermo_pp.output.page.contents import LESS, contents
from thermo_pp.output.page.document import DRAWING_SHA256, SCRIPTS
from thermo_pp.output.results_file import results_keys
from thermo_pp.study.answers import Answers
from thermo_pp.study.load import Study
from thermo_pp.study.run import answer

BROWSER, DRIVER = shutil.which("chromium"), shutil.which("chromedriver")
HOSTILE = '<b>&_%$"x'
TITLE = f"two\nlines {HOSTILE}</script><!--<script> =1+1"
FLAGS = (
    "--headless=new", "--no-sandbox", "--disable-gpu", "--disable-quic", "--no-first-run",
    "--disable-background-networking", "--disable-component-update", "--disable-sync",
)  # fmt: skip
SLIDER = "#temperature"


@pytest.fixture(scope="module")
def results(bundled_answers: Answers) -> dict[str, Any]:
    found: dict[str, Any] = json.loads(json_text(results_keys(bundled_answers)))
    return found


@pytest.fixture(scope="module")
def page(bundled_answers: Answers, tmp_path_factory: pytest.TempPathFactory) -> Path:
    folder = tmp_path_factory.mktemp("page")
    write_page(bundled_answers, folder)
    return folder / "index.html"


def embedded(text: str) -> Any:
    found = re.search(r'<script type="application/json" id="results">(.*?)</script>', text, re.S)
    assert found is not None
    return json.loads(found.group(1))


# Without a browser


def test_the_page_holds_the_results_as_they_are(page: Path, results: dict[str, Any]) -> None:
    assert embedded(page.read_text(encoding="utf-8")) == results


def test_same_results_same_page(results: dict[str, Any]) -> None:
    assert page_text(results) == page_text(copy.deepcopy(results))


def test_the_drawing_library_is_the_published_one_with_its_licence(page: Path) -> None:
    vendor = files("thermo_pp.output.page").joinpath("vendor")
    library = vendor.joinpath("d3.min.js").read_bytes()
    assert hashlib.sha256(library).hexdigest() == DRAWING_SHA256
    licence = vendor.joinpath("LICENSE").read_text(encoding="utf-8")
    assert "Permission to use, copy, modify, and/or distribute" in licence
    assert licence in page.read_text(encoding="utf-8")


def test_our_script_writes_text_and_never_markup() -> None:
    for name in SCRIPTS:
        script = files("thermo_pp.output.page").joinpath(name).read_text(encoding="utf-8")
        for word in ("innerHTML", ".html(", "insertAdjacent", "document.write", "eval(", "fetch(",
                     "XMLHttp", "http:", "https:", "import(", 'attr("style"'):  # fmt: skip
            assert word not in script, f"{name}: {word}"


def test_every_script_and_style_is_in_the_policy(page: Path) -> None:
    text = page.read_text(encoding="utf-8")
    policy = re.search(r'Content-Security-Policy" content="([^"]*)"', text)
    assert policy is not None
    assert policy.group(1).startswith("default-src 'none'; ")
    assert "unsafe" not in policy.group(1)
    assert not re.search(r"\b(src|href)=\"(?!#)", text.split("<script")[0])


def test_hostile_text_opens_no_tag(results: dict[str, Any]) -> None:
    wrong = {**results, "title": TITLE}
    text = page_text(wrong)
    assert embedded(text)["title"] == TITLE
    assert text.count("</script>") == 4
    assert "two\\nlines &lt;b&gt;&amp;_%$&quot;x&lt;/script&gt;" in text


def test_a_page_that_would_be_too_long_says_what_it_lacks(results: dict[str, Any]) -> None:
    """Each lesser page is shorter, what is left is unchanged, and all of it fits in the end."""
    whole, none = contents(results)
    assert none == []
    told = [what for what, _ in LESS]
    least, all_away = contents(results, 0)
    assert len(all_away) > 8
    before, count = len(whole.encode()), 0
    while count < len(all_away):
        text, away = contents(results, before - 1)
        assert len(text.encode()) < before, away
        assert away == [what for what in told if what in away]
        assert len(away) > count
        before, count = len(text.encode()), len(away)
    assert text == least
    kept = json.loads(text)
    own = [one for one in results["barriers"] if one["low_modes"] == "rotor-entropy"]
    assert kept["barriers"] == own
    assert kept["findings"] == results["findings"]


def grown(results: dict[str, Any], species: int, paths: int) -> dict[str, Any]:
    """The results as those of a large study would be."""
    found = copy.deepcopy(results)
    one = found["species"][0]
    found["species"] = [{**one, "name": f"X{k}"} for k in range(species)]
    rows = found["provenance"]
    found["provenance"] = [{**rows[k % len(rows)], "of": f"X{k // 8}"} for k in range(8 * species)]
    found["inputs"] = [{**found["inputs"][1], "path": f"outputs/x{k}.out"} for k in range(2 * species)]  # fmt: skip
    found["doubt"] = None  # it stands at two temperatures only
    found["temperature_k"] = found["temperature_k"][:1] + [300.0 + k for k in range(16)]
    for profile in (*found["profiles"], found["profile_at_conditions"]):
        states = profile["states"][:4]
        profile["states"] = [
            {
                **copy.deepcopy(states[n % 4]),
                "path": f"path {k}",
                "state": f"X{20 * k + n} + {HOSTILE}",
                **{
                    name: [1.2345678901234567 * (k + n)] * 17
                    for name in ("enthalpy_kj_mol", "entropy_j_mol_k", "gibbs_kj_mol")
                },
            }
            for k in range(paths)
            for n in range(20)
        ]
    return found


@pytest.fixture(scope="module")
def large(results: dict[str, Any], tmp_path_factory: pytest.TempPathFactory) -> Path:
    path = tmp_path_factory.mktemp("large") / "index.html"
    path.write_text(page_text({**grown(results, 2000, 30), "title": TITLE}), encoding="utf-8")
    return path


def test_a_large_study_stays_below_ten_megabytes(large: Path) -> None:
    assert 1_000_000 < large.stat().st_size < 10_000_000


# In a browser


class Browser:
    """One session; the log of the console and of the network is asked for after each page."""

    def __init__(self, folder: Path) -> None:
        from selenium import webdriver
        from selenium.webdriver.chrome.service import Service

        options = webdriver.ChromeOptions()
        options.binary_location = str(BROWSER)
        for flag in (*FLAGS, f"--user-data-dir={folder}"):
            options.add_argument(flag)
        options.set_capability("goog:loggingPrefs", {"browser": "ALL", "performance": "ALL"})
        self.driver = webdriver.Chrome(options=options, service=Service(str(DRIVER)))

    def open(self, path: Path, width: int = 1000, scheme: str = "light") -> None:
        self.media(scheme)
        self.width(width)
        self.driver.get(path.as_uri())

    def width(self, width: int) -> None:
        sizes = {"width": width, "height": 900, "deviceScaleFactor": 1, "mobile": False}
        self.driver.execute_cdp_cmd("Emulation.setDeviceMetricsOverride", sizes)

    def media(self, scheme: str) -> None:
        features = [{"name": "prefers-color-scheme", "value": scheme}]
        self.driver.execute_cdp_cmd("Emulation.setEmulatedMedia", {"features": features})

    def run(self, script: str, *arguments: Any) -> Any:
        return self.driver.execute_script(script, *arguments)  # type: ignore[no-untyped-call]

    def press(self, selector: str, key: str) -> None:
        from selenium.webdriver.common.by import By

        self.driver.find_element(By.CSS_SELECTOR, selector).send_keys(key)

    def choose(self, selector: str, value: str) -> None:
        from selenium.webdriver.common.by import By
        from selenium.webdriver.support.ui import Select

        Select(self.driver.find_element(By.CSS_SELECTOR, selector)).select_by_value(value)

    def table(self, caption: str) -> list[list[str]]:
        """Cells of the table whose caption begins so; the value of a number, the text of the rest."""
        found: list[list[str]] = self.run(
            """return [...document.querySelectorAll("table")]
            .filter(t => t.caption.textContent.startsWith(arguments[0])).slice(0, 1)
            .flatMap(t => [...t.tBodies[0].rows])
            .map(r => [...r.cells].map(c => c.dataset.value ?? c.textContent))""",
            caption,
        )
        return found

    def levels(self) -> dict[str, float]:
        """G of each level drawn, by state, and where it stands."""
        return dict(
            self.run(
                """return [...document.querySelectorAll("line.level[data-state]")]
                .map(l => [l.dataset.state, Number(l.dataset.value)])"""
            )
        )


@pytest.fixture(scope="module")
def browser(tmp_path_factory: pytest.TempPathFactory) -> Iterator[Browser]:
    pytest.importorskip("selenium", reason="selenium is not installed")
    if BROWSER is None or DRIVER is None:
        pytest.skip(
            "there is no chromium with its chromedriver (Debian: chromium, chromium-driver)"
        )
    found = Browser(tmp_path_factory.mktemp("browser"))
    yield found
    found.driver.quit()


@pytest.fixture
def shown(browser: Browser, page: Path) -> Browser:
    browser.open(page)
    return browser


def profile_of(results: dict[str, Any], low_modes: str, standard: str) -> dict[str, Any]:
    (found,) = [
        one
        for one in results["profiles"]
        if (one["low_modes"], one["standard_state"]) == (low_modes, standard)
    ]
    return dict(found)


def gibbs(profile: dict[str, Any], k: int) -> dict[str, float]:
    return {one["state"]: one["gibbs_kj_mol"][k] for one in profile["states"]}


def barrier_of(results: dict[str, Any], low_modes: str) -> dict[str, Any]:
    (found,) = [one for one in results["barriers"] if one["low_modes"] == low_modes]
    return dict(found)


def test_the_slider_moves_levels_and_tables_to_values_of_the_results(
    shown: Browser, results: dict[str, Any]
) -> None:
    own = profile_of(results, "rotor-entropy", "1 bar")
    heights = []
    for key, k in (("\ue011", 0), ("\ue010", 1)):  # Home, End
        shown.press(SLIDER, key)
        kelvin = f"{results['temperature_k'][k]:g} K"
        assert shown.run("return document.getElementById('kelvin').textContent") == kelvin
        assert shown.run(f"return document.querySelector('{SLIDER}').ariaValueText || "
                         f"document.querySelector('{SLIDER}').getAttribute('aria-valuetext')") == kelvin  # fmt: skip
        assert shown.levels() == gibbs(own, k)
        rows = shown.table(f"Profile at {kelvin}")
        assert [float(row[5]) for row in rows] == [s["gibbs_kj_mol"][k] for s in own["states"]]
        assert [float(row[3]) for row in rows] == [s["enthalpy_kj_mol"][k] for s in own["states"]]
        control = barrier_of(results, "rotor-entropy")["rates"]["per_pool"]["control"]
        rows = shown.table("Control of the rate")
        assert {row[0]: float(row[2]) for row in rows[: len(control)]} == {
            name: values[k] for name, values in control.items()
        }
        heights.append(
            shown.run(
                "return document.querySelector('line.level[data-state=\"TS2\"]').getAttribute('y1')"
            )
        )
    assert float(heights[1]) < float(heights[0])  # G of the saddle rises on heating


def test_the_slider_stops_at_temperatures_of_the_study_only(
    shown: Browser, results: dict[str, Any]
) -> None:
    ends = shown.run(f"const s = document.querySelector('{SLIDER}'); return [s.min, s.max, s.step]")
    assert ends == ["0", str(len(results["temperature_k"]) - 1), "1"]
    marks = shown.run("return [...document.querySelectorAll('#grid option')].map(o => o.label)")
    assert marks == ["280 K", "298.15 K"]
    assert shown.run("return document.getElementById('kelvin').getAttribute('aria-live')")


def test_choices_show_the_profile_and_rates_of_that_treatment(
    shown: Browser, results: dict[str, Any]
) -> None:
    for low_modes in ("harmonic", "raised", "rotor-enthalpy"):
        shown.choose("#low-modes", low_modes)
        for standard in ("1 mol/L", "1 bar"):
            shown.choose("#standard-state", standard)
            assert shown.levels() == gibbs(profile_of(results, low_modes, standard), 1)
        for definition, title in (("per_free_reactant", "per free"), ("per_pool", "per pool")):
            shown.choose("#definition", definition)
            rate = barrier_of(results, low_modes)["rates"][definition]
            rows = shown.table(f"Rate {title}")
            assert [float(row[1]) for row in rows] == rate["rate_constant"]
            assert [float(row[2]) for row in rows] == rate["arrhenius_energy_kj_mol"]
            drawn = shown.run(
                """return [...document.querySelectorAll("circle[data-of=E]")]
                .map(c => Number(c.dataset.value))"""
            )
            assert drawn == rate["arrhenius_energy_kj_mol"]
    held = shown.run("return document.querySelector('#standard-state').options.length")
    assert held == 3
    shown.run(
        """const s = document.querySelector("#standard-state");
        s.selectedIndex = 2; s.dispatchEvent(new Event("change"))"""
    )
    assert shown.levels() == gibbs(results["profile_at_conditions"], 1)


def test_the_reader_sees_why_the_barrier_is_negative(shown: Browser) -> None:
    words = shown.run("return document.querySelector('.why').textContent")
    assert "TS2 controls the rate most" in words
    assert "below the start in enthalpy and above it in free energy" in words


def test_tables_sort_by_mouse_and_by_keyboard(shown: Browser) -> None:
    def column(number: int) -> list[str]:
        return [row[number] for row in shown.table("Profile at")]

    before = [float(g) for g in column(5)]
    heading = "#profiles thead th:nth-child(6)"
    sort = f"return document.querySelector('{heading}').getAttribute('aria-sort')"
    assert shown.run(sort) == "none"
    shown.run(f"document.querySelector('{heading} button').click()")
    assert shown.run(sort) == "ascending"
    assert [float(g) for g in column(5)] == sorted(before)
    shown.press(f"{heading} button", "\ue007")  # Enter
    assert shown.run(sort) == "descending"
    assert [float(g) for g in column(5)] == sorted(before, reverse=True)
    shown.press("#profiles thead th:nth-child(2) button", " ")
    assert shown.run(sort) == "none"
    assert column(1) == sorted(column(1), key=str.lower)
    shown.press(SLIDER, "\ue011")  # stays sorted at another temperature
    assert column(1) == sorted(column(1), key=str.lower)


def test_a_level_in_focus_says_its_values_and_marks_its_row(
    shown: Browser, results: dict[str, Any]
) -> None:
    shown.run("document.querySelector('g.node[aria-label^=\"TS2 (saddle point)\"]').focus()")
    said = shown.run("return document.querySelector('#profiles output').textContent")
    state = next(s for s in profile_of(results, "rotor-entropy", "1 bar")["states"] if s["state"] == "TS2")  # fmt: skip
    assert f"G {state['gibbs_kj_mol'][1]:.2f} kJ/mol" in said
    assert shown.run("return document.querySelector('tr.on td').textContent") == "TS2"


def test_all_is_reached_by_keyboard(shown: Browser) -> None:
    from selenium.webdriver.common.action_chains import ActionChains
    from selenium.webdriver.common.keys import Keys

    seen = []
    for _ in range(24):
        ActionChains(shown.driver).send_keys(Keys.TAB).perform()
        seen.append(
            shown.run(
                """const e = document.activeElement;
                return e.id || e.getAttribute("class") || e.tagName"""
            )
        )
    assert seen[:5] == ["skip", "temperature", "low-modes", "standard-state", "definition"]
    assert "node" in seen


def test_a_reader_of_the_screen_finds_landmarks_names_and_captions(shown: Browser) -> None:
    assert shown.run("return document.documentElement.lang") == "en"
    for landmark in ("header", "nav[aria-label]", "main", "footer"):
        assert shown.run("return document.querySelectorAll(arguments[0]).length", landmark) == 1
    assert shown.run("return document.querySelectorAll('h1').length") == 1
    bare = shown.run(
        """return [
        ...[...document.querySelectorAll("table")].filter(t => !t.caption?.textContent),
        ...[...document.querySelectorAll("figure svg[role]")].filter(s => !s.querySelector("title")?.textContent
            || !s.querySelector("desc")?.textContent || !s.getAttribute("aria-labelledby")),
        ...[...document.querySelectorAll("input,select")].filter(i => !i.labels?.length && !i.ariaLabel),
        ...[...document.querySelectorAll("section")].filter(s => !s.querySelector("h2")
            || !s.querySelector("table,li")),
        ].map(e => e.outerHTML.slice(0, 80))"""
    )
    assert bare == []
    ids = shown.run("return [...document.querySelectorAll('[id]')].map(e => e.id)")
    assert len(ids) == len(set(ids))
    for target in shown.run("return [...document.querySelectorAll('nav a')].map(a => a.hash.slice(1))"):  # fmt: skip
        assert target in ids


def test_absent_parts_are_named_with_their_reason(shown: Browser, results: dict[str, Any]) -> None:
    items = shown.run("return [...document.querySelectorAll('#absent li')].map(l => l.textContent)")
    assert f"Flow: {results['left_out']['flow']}" in items
    assert not shown.run("return document.querySelector('#flow')")


def test_findings_and_origins_are_shown_with_file_and_line(
    shown: Browser, results: dict[str, Any]
) -> None:
    rows = shown.table("Findings")
    assert len(rows) == len(results["findings"])
    one = next(f for f in results["findings"] if f["line"] is not None)
    assert f"{one['file']}:{one['line']}" in {row[2] for row in rows}
    first = results["provenance"][0]
    row = shown.table("Every number that the answers stand on")[0]
    assert row[:2] == [first["of"], first["quantity"]]
    assert float(row[2]) == first["value"]
    assert row[5] == f"{first['file']}:{first['line']}"


@pytest.mark.parametrize(("width", "scheme"), [(360, "light"), (768, "dark"), (1600, "light")])
def test_no_width_overflows(browser: Browser, page: Path, width: int, scheme: str) -> None:
    browser.open(page, width, scheme)
    inner, outer = browser.run(
        "const page = document.documentElement; return [page.scrollWidth, page.clientWidth]"
    )
    assert inner <= outer
    cut = browser.run(OUTSIDE)
    assert cut == []


OUTSIDE = """return [...document.querySelectorAll("figure svg")].flatMap(svg => {
  const box = svg.getBoundingClientRect();
  return [...svg.querySelectorAll("text")].filter(t => {
    const b = t.getBoundingClientRect();
    return b.width && (b.left < box.left - 1 || b.right > box.right + 1
      || b.top < box.top - 1 || b.bottom > box.bottom + 1);
  }).map(t => t.textContent);
})"""
"""Texts of figures that are cut off."""

COLLIDING = """const texts = [...document.querySelectorAll("#profiles g.label text")];
const all = texts.map(t => [t.textContent, t.getBBox()]);
return all.flatMap(([a, p], n) => all.slice(n + 1).filter(([, q]) =>
  p.x + p.width > q.x && q.x + q.width > p.x && p.y + p.height > q.y + 3 && q.y + q.height > p.y + 3
).map(([b]) => `${a} on ${b}`))"""
"""Texts of the profile that overlap by more than the room that a line of text leaves free."""


@pytest.mark.parametrize("width", [360, 1000, 1600])
def test_labels_of_the_profile_keep_apart(browser: Browser, page: Path, width: int) -> None:
    browser.open(page, width)
    assert len(browser.run("return [...document.querySelectorAll('#profiles g.label')]")) > 10
    assert browser.run(COLLIDING) == []


def test_dark_and_print_have_their_own_colours(browser: Browser, page: Path) -> None:
    ground = "return getComputedStyle(document.body).backgroundColor"
    browser.open(page, scheme="dark")
    dark = browser.run(ground)
    browser.media("light")
    light = browser.run(ground)
    assert sum(map(int, re.findall(r"\d+", dark))) < 150
    assert sum(map(int, re.findall(r"\d+", light))) > 600
    features = [{"name": "prefers-color-scheme", "value": "dark"}]
    browser.driver.execute_cdp_cmd("Emulation.setEmulatedMedia", {"media": "print", "features": features})  # fmt: skip
    assert browser.run(ground) == "rgb(255, 255, 255)"
    browser.driver.execute_cdp_cmd("Emulation.setEmulatedMedia", {"media": ""})


@pytest.fixture(scope="module")
def odd(results: dict[str, Any]) -> Callable[[Any], Any]:
    """The results with hostile names: of a species, a state, a path, the title."""

    def renamed(value: Any) -> Any:
        if isinstance(value, dict):
            return {renamed(key): renamed(item) for key, item in value.items()}
        if isinstance(value, list):
            return [renamed(item) for item in value]
        return re.sub(r"\bTS2\b", HOSTILE, value) if isinstance(value, str) else value

    return renamed


def test_hostile_names_are_shown_as_text(
    browser: Browser, results: dict[str, Any], odd: Callable[[Any], Any], tmp_path: Path
) -> None:
    path = tmp_path / "odd.html"
    path.write_text(page_text({**odd(results), "title": TITLE}), encoding="utf-8")
    browser.open(path, 360)
    assert browser.run("return document.title") == TITLE.replace("\n", "\\n")
    assert browser.run("return document.querySelector('h1').textContent") == TITLE.replace("\n", "\\n")  # fmt: skip
    assert HOSTILE in {row[1] for row in browser.table("Profile at")}
    assert HOSTILE in browser.levels()
    assert HOSTILE in browser.run("return document.querySelector('.why').textContent")
    assert browser.run("return document.querySelectorAll('b').length") == 0
    quiet(browser)


def test_a_large_study_is_still_usable(browser: Browser, large: Path) -> None:
    browser.open(large)
    assert len(browser.table("Species at")) <= 40
    where = browser.run("return document.querySelector('#species [role=status]').textContent")
    assert where == "rows 1 to 40 of 2000"
    browser.run("[...document.querySelectorAll('#species .pages button')].at(-1).click()")
    assert browser.table("Species at")[0][0] == "X40"
    browser.run(
        """const s = document.querySelector("#species input[type=search]");
        s.value = "x1999"; s.dispatchEvent(new Event("input"))"""
    )
    assert [row[0] for row in browser.table("Species at")] == ["X1999"]
    assert len(browser.run("return [...document.querySelectorAll('g.node')]")) == 20
    browser.press(SLIDER, "\ue010")
    items = browser.run("return document.querySelector('#absent').textContent")
    assert "It is in results.json." in items
    quiet(browser)


COURSE = """
[conditions]
temperatures = ["280 K", "25 degC"]
initial = { A = "0.1 mol/L", W = "0.2 mol/L" }
"""
DOUBT = """
[doubt]
deviation = "4 kJ/mol"
samples = 200
"""


def declared(folder: Path, text: str) -> tuple[Study, dict[str, Any]]:
    path = folder / "study.toml"
    path.write_text(text, encoding="utf-8")
    study = Study.load(path)
    return study, json.loads(json_text(results_keys(answer(study))))


def test_doubt_is_drawn(browser: Browser, tmp_path: Path) -> None:
    study, results = declared(tmp_path, TEXT + DOUBT)
    results["doubt"] = plain(doubt_keys(study.doubt()))
    (tmp_path / "index.html").write_text(page_text(results), encoding="utf-8")
    browser.open(tmp_path / "index.html", 360)
    samples = results["doubt"]["rates"]["per_pool"]["samples"]
    rows = browser.table("Doubt")
    assert [float(row[1]) for row in rows] == samples["negative_energy"]["value"]
    median = results["doubt"]["quantiles"].index(0.5)
    assert [float(row[4 + median]) for row in rows] == samples["energy_bands_kj_mol"][median]
    assert browser.run("return document.querySelectorAll('#doubt path.band').length") == 2
    assert browser.run(OUTSIDE) == []
    quiet(browser)


def test_time_courses_are_drawn_where_no_rate_is_asked_for(
    browser: Browser, tmp_path: Path
) -> None:
    steps = TEXT.split("[species.A]", 1)[1]
    text = COURSE + "[species.A]" + steps.split("[effective]")[0]
    _, results = declared(tmp_path, text)
    (tmp_path / "index.html").write_text(page_text(results), encoding="utf-8")
    browser.open(tmp_path / "index.html", 360)
    course = results["time_course"]["courses"][0]
    rows = browser.table("Time course")
    assert [float(row[0]) for row in rows] == course["time_s"][: len(rows)]
    drawn = browser.run("return document.querySelectorAll('#time_course path.curve').length")
    assert drawn == min(7, len(course["concentration_mol_l"]))
    assert browser.run(OUTSIDE) == []
    assert "Profile" in browser.run("return document.querySelector('#absent').textContent")
    quiet(browser)


def quiet(browser: Browser) -> None:
    """No error on the console, and no request but for files on disk."""
    assert browser.driver.get_log("browser") == []
    asked = [
        json.loads(entry["message"])["message"] for entry in browser.driver.get_log("performance")
    ]
    urls = [
        one["params"]["request"]["url"]
        for one in asked
        if one["method"] == "Network.requestWillBeSent"
        and one["params"]["documentURL"].startswith("file:")  # not the browser's own first page
    ]
    assert urls
    assert [url for url in urls if not url.startswith("file:///")] == []


def test_nothing_leaves_the_page_and_the_console_stays_empty(browser: Browser, page: Path) -> None:
    browser.open(page)
    browser.press(SLIDER, "\ue011")
    quiet(browser)
    refused = browser.run(
        """return new Promise(done => {
        document.addEventListener("securitypolicyviolation", event => done(event.violatedDirective));
        const image = new Image(); image.src = "https://example.invalid/x.png";
        setTimeout(() => done("nothing was refused"), 2000); })"""
    )
    assert refused == "img-src"  # what a script in the page would ask for is refused by the policy
    browser.driver.get_log("browser")
    browser.driver.get_log("performance")
