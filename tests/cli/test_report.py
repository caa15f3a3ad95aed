"""``oscsolve report``: text, JSON, and a page that is opened in a real browser."""

from __future__ import annotations

import base64
import contextlib
import json
import re
import shlex
import shutil
import subprocess
import urllib.error
import urllib.request
from html.parser import HTMLParser
from pathlib import Path

import numpy as np
import pytest

import oscsolve
from oscsolve.cli.markup import formula, symbol, tag
from oscsolve.cli.report_page import modes_command

#: A name that breaks every page that does not escape it.
WICKED = '</title></script><script>window.broken = 1</script><b>A & B\'s "star"</b>'
_VOID = {"meta", "link", "img", "br"}


@pytest.fixture(scope="module")
def folder(tmp_path_factory) -> Path:
    return tmp_path_factory.mktemp("report")


@pytest.fixture(scope="module")
def wicked_file(folder, star_n3) -> Path:
    """Modes of a polytrope whose name and source are hostile."""
    star = star_n3.with_changes(name=WICKED, source="<img src=x onerror=alert(1)>")
    modes = oscsolve.solve_modes(star, (0, 1, 2), (0.5, 200), unit="sigma2")
    oscsolve.save_modes(modes, folder / "wicked.h5")
    return folder / "wicked.h5"


@pytest.fixture(scope="module")
def lantern_file(folder) -> Path:
    """Modes of the Sun-like demo star."""
    path = Path(__file__).resolve().parents[2] / "models_demo" / "lantern-1.fgong"
    star = oscsolve.read_model(path)
    modes = oscsolve.solve_modes(star, (0, 1, 2, 3), (1000, 4000), surface="isothermal")
    oscsolve.save_modes(modes, folder / "lantern-1.h5")
    return folder / "lantern-1.h5"


@pytest.fixture(scope="module")
def giant_file(folder, shared_data) -> Path:
    """Modes of a red giant, many of them mixed."""
    star = oscsolve.read_model(shared_data / "giants" / "red-giant-columns.txt")
    modes = oscsolve.solve_modes(star, (0, 1, 2), (150, 400), surface="isothermal")
    oscsolve.save_modes(modes, folder / "giant.h5")
    return folder / "giant.h5"


@pytest.fixture
def page_of(run):
    """Function that makes the page of a mode list and gives its path."""

    def make(path: Path) -> Path:
        out = path.with_suffix(".html")
        if not out.exists():
            ended = run("report", path, "-o", out)
            assert (ended.status, ended.out, ended.err) == (0, "", "")
        return out

    return make


class _Reader(HTMLParser):
    """Checks that every element is closed, and collects tables, links and texts."""

    def __init__(self) -> None:
        super().__init__(convert_charrefs=True)
        self.open: list[str] = []
        self.attributes: list[tuple[str, str, str | None]] = []
        self.texts: dict[str, list[str]] = {}
        self.rows: list[list[str]] = []

    def handle_starttag(self, tag: str, attrs: list[tuple[str, str | None]]) -> None:
        self.attributes += [(tag, name, value) for name, value in attrs]
        if tag not in _VOID:
            self.open.append(tag)
        if tag == "tr":
            self.rows.append([])
        if tag in ("td", "th"):
            self.rows[-1].append("")

    def handle_endtag(self, tag: str) -> None:
        assert self.open.pop() == tag

    def handle_data(self, data: str) -> None:
        if self.open:
            self.texts.setdefault(self.open[-1], []).append(data)
        if {"td", "th"} & set(self.open):
            self.rows[-1][-1] += data


def _read(page: Path) -> _Reader:
    reader = _Reader()
    reader.feed(page.read_text(encoding="utf-8"))
    reader.close()
    assert reader.open == []
    return reader


def test_text_holds_the_quantities_with_their_errors(run, lantern_file):
    ended = run("report", lantern_file)
    assert (ended.status, ended.err) == (0, "")
    fit = oscsolve.fit_large_separation(oscsolve.load_modes(lantern_file))
    (line,) = re.findall(r"^ *Delta nu_0 .*line through.*$", ended.out, re.MULTILINE)
    value, error = re.search(r"([\d.]+) \+- ([\d.]+)", line).groups()
    assert float(value) == pytest.approx(
        fit.separation, abs=0.6 * 10.0 ** -len(value.split(".")[1])
    )
    assert float(error) == pytest.approx(fit.separation_error, rel=0.1)
    for words in ("epsilon_1", "r_02", "d_01", "Delta_2 nu_0", "tau_c", "Complete"):
        assert words in ended.out
    assert max(map(len, ended.out.splitlines())) <= 160


def test_json_holds_every_order(run, lantern_file):
    document = json.loads(run("report", lantern_file, "--json").out)
    modes = oscsolve.load_modes(lantern_file)
    found = oscsolve.separations(modes)
    assert document["complete"] is True
    assert set(document["separations"]) == set(found)
    ratio = document["separations"]["ratio_02"]
    assert ratio["value"] == found["ratio_02"].value.tolist()
    assert ratio["order"] == found["ratio_02"].order.tolist()
    assert ratio["unit"] == "1" and "delta nu_02" in ratio["definition"]
    assert document["scaling"]["nu_max"] == oscsolve.nu_max_scaling(modes.star)


def test_an_incomplete_list_says_so_and_ends_with_one(run, folder, handmade_modes):
    from oscsolve.pulsation.modeset import Census

    census = Census([0, 1], [-80.0, 100.0], [1200.0, 1200.0], [2, 4], [2, 3], [0, 1])
    oscsolve.save_modes(handmade_modes(census=census), folder / "short.h5")
    ended = run("report", folder / "short.h5")
    assert ended.status == 1 and "NOT COMPLETE" in ended.out
    assert run("report", folder / "short.h5", "-o", folder / "short.html").status == 1
    reader = _read(folder / "short.html")
    assert any("DOES NOT CLOSE" in row for row in reader.rows)
    rows = [row for row in reader.rows if row[-1] == "grows"]
    assert len(rows) == 1 and rows[0][5].strip().startswith("-")


def test_the_page_holds_the_whole_list_without_any_script(page_of, giant_file):
    modes = oscsolve.load_modes(giant_file)
    reader = _read(page_of(giant_file))
    rows = [row for row in reader.rows if len(row) >= 9 and row[2] in ("radial", "p", "g", "mixed")]
    assert len(rows) == len(modes)
    assert [int(row[0]) for row in rows] == modes.degree.tolist()
    assert [int(row[1]) for row in rows] == modes.order.tolist()
    assert [float(row[5]) for row in rows] == pytest.approx(modes.nu.tolist(), rel=1e-7)
    fit = oscsolve.asymptotics(modes).mixed[0]
    assert any(row[0] == "q1" and row[1].startswith(f"{fit.coupling:.3f}") for row in reader.rows)
    sha = "".join(reader.texts["code"])
    assert modes.star.source_hash in sha


def test_hostile_names_stay_text(page_of, wicked_file):
    page = page_of(wicked_file)
    reader = _read(page)
    assert reader.texts["h1"] == [WICKED]
    assert reader.texts["title"] == [f"Modes of {WICKED}"]
    assert len(reader.texts["script"]) == 1 and "window.broken" not in reader.texts["script"][0]
    assert not any(name.startswith("on") for _, name, _ in reader.attributes)


def test_nothing_on_the_page_points_elsewhere(page_of, lantern_file):
    reader = _read(page_of(lantern_file))
    for _, name, value in reader.attributes:
        if name in ("src", "href"):
            assert value.startswith(("#", "data:")), value
    style = "".join(reader.texts["style"])
    assert "url(" not in style and "@import" not in style
    policies = [value for _, name, value in reader.attributes if name == "content"]
    assert any(policy.startswith("default-src 'none'") for policy in policies)


def test_pictures_that_suit_the_star_are_inside(page_of, lantern_file):
    page = page_of(lantern_file).read_text(encoding="utf-8")
    titles = re.findall(r'<img alt="([^"]+)" src="data:image/svg\+xml;base64,', page)
    assert {"Where waves propagate", "Frequencies folded", "Inertia"} <= set(titles)


def test_the_command_on_the_page_makes_the_same_list(run, tmp_path, polytrope_file, monkeypatch):
    monkeypatch.chdir(tmp_path)
    asked = ("--degrees", "0-1,3", "--band", "2:60sigma2", "--tolerance", "1e-9", "--cowling")
    more = ("--gravitational-constant", "6.67e-8")
    assert run("modes", polytrope_file, *asked, *more, "--out", "it's.h5").status == 0
    first = oscsolve.load_modes("it's.h5")
    line = modes_command(first, "it's.h5")
    assert "--degrees 0-1,3" in line and "--cowling" in line and "--tolerance 1e-9" in line
    words = shlex.split(line)
    assert words[0] == "oscsolve"
    assert run(*words[1:], "--overwrite").status == 0
    again = oscsolve.load_modes("it's.h5")
    assert again.nu.tolist() == pytest.approx(first.nu.tolist(), rel=1e-12)
    assert again.star.gravitational_constant == 6.67e-8


def test_a_star_that_was_made_is_taken_from_its_own_file(run, folder, star_n3, monkeypatch):
    monkeypatch.chdir(folder)
    modes = oscsolve.solve_modes(star_n3, (1,), (2, 60), unit="sigma2")
    oscsolve.save_modes(modes, "made.h5")
    words = shlex.split(modes_command(modes, "made.h5"))
    assert run(*words[1:]).status == 0
    assert oscsolve.load_modes("again-made.h5").nu.tolist() == pytest.approx(modes.nu.tolist())


def test_wrong_usage_is_one_line(refused, lantern_file, tmp_path):
    (tmp_path / "old.html").write_text("mine")
    assert "--overwrite" in refused("report", lantern_file, "-o", tmp_path / "old.html")
    assert (tmp_path / "old.html").read_text() == "mine"
    assert ".html" in refused("report", lantern_file, "-o", tmp_path / "page.pdf")
    assert "one of them" in refused("report", lantern_file, "-o", tmp_path / "p.html", "--json")
    assert "no such file" in refused("report", tmp_path / "none.h5")
    assert "not an HDF5 file" in refused("report", tmp_path / "old.html")


def test_symbols_become_letters():
    assert symbol("Delta nu_02") == "\u0394<i>\u03bd</i><sub>02</sub>"
    assert symbol("Delta_2 nu_0") == "\u0394<sub>2</sub><i>\u03bd</i><sub>0</sub>"
    assert symbol("r_01") == "<i>r</i><sub>01</sub>"
    assert formula("[2 int dr/c]^-1 of 3e-09 uHz & n-1") == (
        "[2 \u222bdr/c]<sup>\u22121</sup> of 3\u00a0\u00d7\u00a010<sup>\u22129</sup> \u03bcHz "
        "&amp; n\u22121"
    )
    assert tag("td", "<", None, class_="n", data_value='"') == (
        '<td class="n" data-value="&quot;">&lt;</td>'
    )


# The page in a browser.


#: Quiet, alone, and without a word to any network.
_FLAGS = (
    "headless",
    "no-sandbox",
    "disable-gpu",
    "disable-quic",
    "no-first-run",
    "disable-background-networking",
    "disable-component-update",
    "disable-sync",
    "disable-dev-shm-usage",
)


class Browser:
    """Chromium behind chromedriver, spoken to over its HTTP protocol (W3C WebDriver)."""

    def __init__(self, driver: str, chromium: str, profile: Path) -> None:
        self._process = subprocess.Popen(
            [driver, "--port=0"], stdout=subprocess.PIPE, stderr=subprocess.DEVNULL, text=True
        )
        assert self._process.stdout is not None
        port = None
        while port is None:
            line = self._process.stdout.readline()
            if not line:
                raise RuntimeError("chromedriver ended before it opened a port")
            found = re.search(r"started successfully on port (\d+)", line)
            port = found and found[1]
        self._base = f"http://127.0.0.1:{port}"
        flags = [f"--{flag}" for flag in _FLAGS]
        options = {"binary": chromium, "args": [*flags, f"--user-data-dir={profile}"]}
        capabilities = {
            "browserName": "chrome",
            "goog:chromeOptions": options,
            "goog:loggingPrefs": {"browser": "ALL", "performance": "ALL"},
        }
        try:
            answer = self._ask("POST", "/session", {"capabilities": {"alwaysMatch": capabilities}})
        except BaseException:
            self._stop()
            raise
        self._base += f"/session/{answer['sessionId']}"
        # Away from the start page, which loads things of its own.
        self._ask("POST", "/url", {"url": "about:blank"})

    def _ask(self, method: str, path: str, body: object = None) -> object:
        data = None if body is None else json.dumps(body).encode()
        request = urllib.request.Request(self._base + path, data, method=method)
        request.add_header("Content-Type", "application/json")
        # No proxy of the environment stands between a test and its own machine.
        opener = urllib.request.build_opener(urllib.request.ProxyHandler({}))
        with opener.open(request, timeout=60) as answer:
            return json.load(answer)["value"]

    def show(self, page: Path, width: int, height: int = 900) -> None:
        metrics = {"width": width, "height": height, "deviceScaleFactor": 1, "mobile": width < 600}
        self.tell("Emulation.setDeviceMetricsOverride", metrics)
        self._ask("POST", "/url", {"url": page.as_uri()})

    def tell(self, command: str, parameters: object) -> dict:
        answer = self._ask("POST", "/goog/cdp/execute", {"cmd": command, "params": parameters})
        assert isinstance(answer, dict)
        return answer

    def run(self, script: str) -> object:
        return self._ask("POST", "/execute/sync", {"script": script, "args": []})

    def log(self, kind: str) -> list[dict]:
        """Entries since the last call."""
        entries = self._ask("POST", "/se/log", {"type": kind})
        assert isinstance(entries, list)
        return entries

    def pdf(self) -> bytes:
        return base64.b64decode(str(self._ask("POST", "/print", {})))

    def close(self) -> None:
        with contextlib.suppress(urllib.error.URLError):
            self._ask("DELETE", "")
        self._stop()

    def _stop(self) -> None:
        self._process.terminate()
        self._process.wait(timeout=30)
        assert self._process.stdout is not None
        self._process.stdout.close()


@pytest.fixture(scope="module")
def browser(tmp_path_factory):
    chromium = shutil.which("chromium") or "/usr/bin/chromium"
    driver = shutil.which("chromedriver")
    if not Path(chromium).exists() or driver is None:
        pytest.skip("no chromium with chromedriver here; Debian has them as chromium-driver")
    opened = Browser(driver, chromium, tmp_path_factory.mktemp("profile"))
    yield opened
    opened.close()


PAGES = ("wicked_file", "lantern_file", "giant_file")


@pytest.mark.parametrize("file", PAGES)
def test_it_loads_without_errors_and_asks_nobody(browser, page_of, request, file):
    page = page_of(request.getfixturevalue(file))
    browser.log("browser"), browser.log("performance")
    browser.show(page, 1280)
    assert browser.run("return document.readyState") == "complete"
    assert [entry["message"] for entry in browser.log("browser")] == []
    asked = [json.loads(entry["message"])["message"] for entry in browser.log("performance")]
    urls = {
        event["params"]["request"]["url"]
        for event in asked
        if event["method"] == "Network.requestWillBeSent"
    }
    assert {url for url in urls if not url.startswith("data:")} == {page.as_uri()}
    assert browser.run("return window.broken === undefined")
    images = browser.run(
        "return Array.from(document.images, i => [i.complete, i.naturalWidth, i.alt])"
    )
    assert all(complete and width > 0 and alt for complete, width, alt in images)


@pytest.mark.parametrize("width", [1280, 390])
@pytest.mark.parametrize("file", PAGES)
def test_it_fits_a_laptop_and_a_phone(browser, page_of, request, file, width):
    browser.show(page_of(request.getfixturevalue(file)), width)
    browser.run("document.querySelectorAll('details').forEach(d => { d.open = true; })")
    assert browser.run("return window.innerWidth") == width
    assert browser.run("return document.documentElement.scrollWidth") <= width
    # Whatever is wider, a long table, scrolls in a box of its own.
    outside = browser.run(
        "return Array.from(document.body.querySelectorAll('*')).filter(e => !e.closest('.box') && "
        "e.getBoundingClientRect().right > window.innerWidth + 0.5).map(e => e.outerHTML)"
    )
    assert outside == []
    # Letters that a reader need not enlarge: 12 px and up.
    sizes = browser.run(
        "return Array.from(document.querySelectorAll('p, td, th, dd, dt, li'), "
        "e => parseFloat(getComputedStyle(e).fontSize))"
    )
    assert min(sizes) >= 12.0


def test_a_click_on_a_heading_sorts(browser, page_of, giant_file):
    modes = oscsolve.load_modes(giant_file)
    browser.show(page_of(giant_file), 1280)
    cells = (
        "return Array.from(document.querySelector('#all-modes').tBodies[0].rows, "
        "r => r.cells[{}].textContent)"
    )

    def click(column: int) -> list[str]:
        browser.run(f"document.querySelectorAll('#all-modes thead button')[{column}].click()")
        state = browser.run("return document.querySelector('#all-modes [aria-sort]').ariaSort")
        column_texts = browser.run(cells.format(column))
        assert isinstance(column_texts, list)
        return [str(state), *column_texts]

    assert browser.run(cells.format(0)) == [str(degree) for degree in modes.degree]
    state, *nu = click(5)
    assert state == "ascending"
    assert [float(v) for v in nu] == pytest.approx(np.sort(modes.nu).tolist())
    state, *nu = click(5)
    assert state == "descending"
    assert [float(v) for v in nu] == pytest.approx(np.sort(modes.nu)[::-1].tolist())
    # Orders as numbers: -60 before -9 before 10.
    _, *order = click(1)
    assert [int(v) for v in order] == sorted(modes.order.tolist())
    _, *kind = click(2)
    assert kind == sorted(kind) and len(kind) == len(modes)
    # Rows that are equal stay in order: sorted by n just before.
    first = [int(v) for v in browser.run(cells.format(1))][: kind.count("mixed")]
    assert first == sorted(first)
    assert browser.run("return document.querySelectorAll('#all-modes [aria-sort]').length") == 1


@pytest.mark.parametrize("file", PAGES)
def test_it_prints(browser, page_of, request, file):
    modes = oscsolve.load_modes(request.getfixturevalue(file))
    browser.show(page_of(request.getfixturevalue(file)), 1280)
    pdf = browser.pdf()
    assert pdf.startswith(b"%PDF-") and pdf.rstrip().endswith(b"%%EOF")
    pages = len(re.findall(rb"/Type\s*/Page\b", pdf))
    # The whole list is there, some fifty lines to a page, not the part in view.
    assert pages >= 1 + len(modes) / 60
    # A4 within its margins, in CSS pixels: 182 mm.
    browser.show(page_of(request.getfixturevalue(file)), 688)
    browser.tell("Emulation.setEmulatedMedia", {"media": "print"})
    browser.run("document.querySelectorAll('details').forEach(d => { d.open = true; })")
    hidden = browser.run("return getComputedStyle(document.querySelector('nav')).display")
    cut = browser.run(
        "return Array.from(document.querySelectorAll('.box')).filter("
        "e => e.scrollHeight > e.clientHeight + 1).length"
    )
    widest = browser.run("return document.documentElement.scrollWidth")
    browser.tell("Emulation.setEmulatedMedia", {"media": ""})
    assert hidden == "none" and cut == 0 and widest <= 688
