"""The HTML page in a real browser, headless: it opens, filters, sorts, darkens, prints, fits."""

import base64
import json
import re
import shutil

import pytest

from tests.report.html.test_document import FAULTY, HOSTILE, PARTLY, ROOT, STATION, page_of

webdriver = pytest.importorskip("selenium.webdriver", reason="selenium is not installed")
ui = pytest.importorskip("selenium.webdriver.support.ui")
BROWSER = shutil.which("chromium") or shutil.which("chromium-browser")
DRIVER = shutil.which("chromedriver")

pytestmark = pytest.mark.skipif(
    not BROWSER or not DRIVER,
    reason="the page is tried in Chromium: apt-get install chromium chromium-driver",
)

SWITCHES = (
    "--headless",
    "--no-sandbox",
    "--disable-gpu",
    "--disable-quic",
    "--no-first-run",
    "--disable-background-networking",
    "--disable-component-update",
    "--disable-sync",
    "--window-size=1280,1400",
)

MIXED = """gauge with many faults
* railguard: kind board
VIN in 0 SIN(0 0.5 1k)
R1 in n1 10k
R2 n1 o1 1meg
XU1 0 n1 vp vn o1 TL072
RL o1 0 100
R3 o1 n2 10k
R4 n2 o2 10k
XU2 0 n2 vp vn o2 LM358
C9 o2 0 10n
VP vp 0 12
VN vn 0 -12
.end
"""

CONTRASTS = """
const plain = (text) => {
  const canvas = document.createElement('canvas').getContext('2d', {willReadFrequently: true});
  canvas.fillStyle = text; canvas.fillRect(0, 0, 1, 1);
  return [...canvas.getImageData(0, 0, 1, 1).data];
};
const luminance = ([r, g, b]) => [r, g, b].map((c) => c / 255)
  .map((c) => c <= 0.04045 ? c / 12.92 : ((c + 0.055) / 1.055) ** 2.4)
  .reduce((sum, c, i) => sum + c * [0.2126, 0.7152, 0.0722][i], 0);
const ground = (element) => {
  for (let at = element; at; at = at.parentElement) {
    const colour = getComputedStyle(at).backgroundColor;
    if (plain(colour)[3] === 255) return plain(colour);
  }
  return [255, 255, 255];
};
const found = [];
for (const element of document.querySelectorAll('body *')) {
  if (![...element.childNodes].some((n) => n.nodeType === 3 && n.data.trim())) continue;
  if (!element.checkVisibility() || element.closest('script, style, option')) continue;
  const style = getComputedStyle(element);
  const ink = element.closest('svg') ? style.fill : style.color;
  const pair = [luminance(plain(ink)), luminance(ground(element))].sort((a, b) => b - a);
  found.push([(pair[0] + 0.05) / (pair[1] + 0.05), element.outerHTML.slice(0, 90)]);
}
return found;
"""


@pytest.fixture(scope="module")
def browser(tmp_path_factory):
    """Start a browser with a profile of its own and no way out to a network it needs."""
    options = webdriver.ChromeOptions()
    options.binary_location = BROWSER
    for switch in SWITCHES:
        options.add_argument(switch)
    options.add_argument(f"--user-data-dir={tmp_path_factory.mktemp('profile')}")
    options.set_capability("goog:loggingPrefs", {"browser": "ALL"})
    started = webdriver.Chrome(options, webdriver.ChromeService(DRIVER))
    yield started
    started.quit()


@pytest.fixture
def opened(browser, tmp_path):
    """Return a function that opens the page of a source from the disk."""

    def open_page(source):
        place = tmp_path / "review.html"
        place.write_text(page_of(source), encoding="utf-8")
        browser.set_window_size(1280, 1400)
        media(browser)
        browser.get_log("browser")
        browser.get(place.as_uri())
        return browser

    return open_page


def media(browser, kind="", scheme="light", motion="no-preference"):
    """Let the browser claim a medium, a colour scheme and a wish for little motion."""
    features = [
        {"name": "prefers-color-scheme", "value": scheme},
        {"name": "prefers-reduced-motion", "value": motion},
    ]
    browser.execute_cdp_cmd("Emulation.setEmulatedMedia", {"media": kind, "features": features})


def css(browser, selector):
    """Return the elements a selector finds."""
    return browser.find_elements("css selector", selector)


def choose(browser, name, value):
    """Choose a value of a list by its name or id."""
    found = css(browser, f'select[name="{name}"], select#{name}')[0]
    ui.Select(found).select_by_visible_text(value)


def visible(browser, selector):
    """Return those that are shown."""
    return [element for element in css(browser, selector) if element.is_displayed()]


@pytest.mark.parametrize(
    "source",
    [STATION, FAULTY, MIXED, PARTLY, "\n", ROOT / "nowhere.cir", HOSTILE, [FAULTY, STATION]],
    ids=["sound", "faulty", "mixed", "partly", "empty", "missing", "hostile", "several"],
)
def test_opens_without_a_word_on_the_console(opened, source):
    """No error, no warning, nothing fetched, no script but its own."""
    browser = opened(source)
    assert browser.get_log("browser") == []
    fetched = "return performance.getEntriesByType('resource').map((entry) => entry.name)"
    assert browser.execute_script(fetched) == []
    assert browser.execute_script("return document.scripts.length") == 1
    assert css(browser, "h1")[0].is_displayed()


def test_filter_shows_only_what_is_asked_for(opened):
    """Severity, family and device narrow the table and the stages together."""
    browser = opened(MIXED)
    everything = len(css(browser, "#index tbody tr"))
    assert everything == len(visible(browser, "#index tbody tr")) > 3
    css(browser, '#filter input[value="minor"]')[0].click()
    rows = visible(browser, "#index tbody tr")
    assert 0 < len(rows) < everything
    assert "minor" not in {row.get_attribute("data-severity") for row in rows}
    assert not visible(browser, 'article.finding[data-severity="minor"]')
    assert css(browser, "#shown")[0].text == f"{len(rows)} of {everything} findings shown"
    css(browser, "#filter button")[0].click()
    assert len(visible(browser, "#index tbody tr")) == everything
    for name in ("family", "device"):
        value = visible(browser, "#index tbody tr")[-1].get_attribute(f"data-{name}")
        choose(browser, name, value)
        shown = visible(browser, "#index tbody tr")
        assert {row.get_attribute(f"data-{name}") for row in shown} == {value}
        assert all(visible(browser, f"#{s.get_attribute('id')} article")
                   for s in visible(browser, "section.subject"))  # fmt: skip
        browser.find_element("name", name).send_keys("\ue00c")  # Escape
        assert len(visible(browser, "#index tbody tr")) == everything


def test_columns_sort_both_ways(opened):
    """A heading sorts, says so to those who listen, and sorts the other way when asked again."""
    browser = opened(MIXED)
    order = {"critical": 0, "major": 1, "minor": 2, "remark": 3}
    for key, value in (
        ("line", int), ("family", str), ("severity", order.get), ("device", str.casefold),
    ):  # fmt: skip
        heading = css(browser, f'th[data-key="{key}"]')[0]
        for direction in ("ascending", "descending"):
            heading.find_element("tag name", "button").click()
            rows = css(browser, "#index tbody tr")
            found = [value(row.get_attribute(f"data-{key}")) for row in rows]
            assert found == sorted(found, reverse=direction == "descending")
            assert heading.get_attribute("aria-sort") == direction
    assert len(css(browser, "th[aria-sort]")) == 1


def test_keyboard_walks_and_goes_to_a_finding(opened):
    """Arrows, Home and End move between findings; Enter leads to one, which takes the focus."""
    browser = opened(MIXED)
    links = css(browser, "#index tbody a")
    links[0].send_keys("\ue015")  # arrow down
    assert browser.switch_to.active_element == links[1]
    browser.switch_to.active_element.send_keys("\ue010")  # End
    assert browser.switch_to.active_element == links[-1]
    browser.switch_to.active_element.send_keys("\ue011")  # Home
    assert browser.switch_to.active_element == links[0]
    browser.switch_to.active_element.send_keys("\ue007")  # Enter
    target = links[0].get_attribute("href").split("#")[1]
    browser.execute_async_script("requestAnimationFrame(() => setTimeout(arguments[0], 50))")
    assert browser.switch_to.active_element.get_attribute("id") == target


def test_every_control_is_reached_by_the_tab_key_and_has_a_name(opened):
    """The tab key passes all controls, and each of them says what it is."""
    browser = opened(MIXED)
    names = []
    for _ in range(25):
        browser.execute_cdp_cmd(
            "Input.dispatchKeyEvent", {"type": "keyDown", "key": "Tab", "windowsVirtualKeyCode": 9}
        )
        active = browser.switch_to.active_element
        if active.tag_name in ("select", "input", "button"):
            names.append(active.accessible_name)
    assert all(names)
    assert {"Appearance", "Family", "Device", "Show all", "Severity", "Line"} <= set(names)


@pytest.mark.parametrize("scheme", ["light", "dark"])
def test_text_stands_out_from_its_ground(opened, scheme):
    """WCAG 2.2, 1.4.3: a contrast of at least 4.5 to 1, in the light and in the dark."""
    browser = opened(MIXED)
    media(browser, scheme=scheme)
    browser.execute_script("document.querySelectorAll('details').forEach((d) => d.open = true)")
    found = browser.execute_script(CONTRASTS)
    assert len(found) > 200
    assert [entry for entry in found if entry[0] < 4.5] == []


def test_appearance_follows_the_system_and_the_reader(opened):
    """Dark where the system is dark, unless the reader asks for light."""
    browser = opened(STATION)
    colour = "return getComputedStyle(document.body).backgroundColor"
    light = browser.execute_script(colour)
    media(browser, scheme="dark")
    dark = browser.execute_script(colour)
    assert light != dark
    choose(browser, "appearance", "light")
    assert browser.execute_script(colour) == light
    media(browser, scheme="light")
    choose(browser, "appearance", "dark")
    assert browser.execute_script(colour) == dark


def test_no_motion_where_none_is_wished(opened):
    """Scrolling glides only where the system does not ask for reduced motion."""
    browser = opened(STATION)
    glide = "return getComputedStyle(document.documentElement).scrollBehavior"
    assert browser.execute_script(glide) == "smooth"
    media(browser, motion="reduce")
    assert browser.execute_script(glide) == "auto"


@pytest.mark.parametrize("width", [360, 600, 900])
def test_fits_narrow_windows(browser, opened, width):
    """Nothing makes the page wider than its window."""
    opened(MIXED)
    metrics = {"width": width, "height": 800, "deviceScaleFactor": 1, "mobile": False}
    browser.execute_cdp_cmd("Emulation.setDeviceMetricsOverride", metrics)
    browser.execute_script("document.querySelectorAll('details').forEach((d) => d.open = true)")
    widest = browser.execute_script("return document.documentElement.scrollWidth")
    browser.execute_cdp_cmd("Emulation.clearDeviceMetricsOverride", {})
    assert widest <= width


def test_prints_whole_on_a4(opened):
    """Folded stages are printed unfolded, controls are not, on sheets of 210 by 297 mm."""
    browser = opened(STATION)
    printed = browser.execute_cdp_cmd("Page.printToPDF", {"preferCSSPageSize": True})
    data = base64.b64decode(printed["data"])
    (width, height), *others = {
        (round(float(w)), round(float(h)))
        for w, h in re.findall(rb"/MediaBox \[0 0 ([\d.]+) ([\d.]+)\]", data)
    }
    assert (width, height, others) == (595, 842, [])
    assert data.count(b"/Type /Page\n") > 4
    media(browser, kind="print")
    assert not visible(browser, "#filter, .appearance, .keys, .fold")
    inside = "return document.querySelector('details.quiet svg').getBoundingClientRect().height"
    assert browser.execute_script(inside) > 50


def test_without_script_everything_is_there(browser, opened):
    """Mail readers run no script: controls that need one are away, findings and lines are not."""
    browser.execute_cdp_cmd("Emulation.setScriptExecutionDisabled", {"value": True})
    try:
        opened(MIXED)
        document = browser.execute_cdp_cmd("DOM.getDocument", {"depth": -1})
    finally:
        browser.execute_cdp_cmd("Emulation.setScriptExecutionDisabled", {"value": False})
    text = json.dumps(document)
    assert '"filter"' in text
    hidden = re.findall(r'"nodeName": "FORM".*?"attributes": \[(.*?)\]', text)
    assert hidden
    assert '"hidden"' in hidden[0]
