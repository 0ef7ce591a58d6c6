"""The page in a browser, as a reader uses it: Chromium without a window, driven by the tests."""

from __future__ import annotations

import io
import json
import shutil
import time
from collections.abc import Callable, Iterator
from pathlib import Path
from typing import Any

import numpy as np
import pytest
from PIL import Image
from selenium import webdriver
from selenium.webdriver import ActionChains, Keys
from selenium.webdriver.chrome.service import Service
from selenium.webdriver.common.by import By
from selenium.webdriver.support.ui import WebDriverWait

Driver = webdriver.Chrome
Open = Callable[..., Driver]

pytestmark = pytest.mark.usefixtures("needs_browser")


def started(*more: str) -> Driver:
    options = webdriver.ChromeOptions()
    arguments = ("--headless=new", "--no-sandbox", "--hide-scrollbars", "--window-size=900,700")
    for argument in (*arguments, "--disable-dev-shm-usage", *more):
        options.add_argument(argument)
    options.set_capability("goog:loggingPrefs", {"browser": "ALL", "performance": "ALL"})
    return webdriver.Chrome(options=options, service=Service(shutil.which("chromedriver")))


@pytest.fixture(scope="module")
def browser(needs_browser: None) -> Iterator[Driver]:
    """One browser that draws WebGL on the processor, for all tests here."""
    driver = started("--enable-unsafe-swiftshader")
    yield driver
    driver.quit()


@pytest.fixture
def look(browser: Driver, page: Path) -> Open:
    """Opens the page as a reader with some wishes would see it."""

    def open_page(width: int = 900, page: Path = page, **wishes: str) -> Driver:
        browser.get_log("browser")
        browser.get_log("performance")
        emulate(browser, width, **wishes)
        browser.get(page.as_uri())
        WebDriverWait(browser, 30).until(lambda d: d.find_elements(By.CSS_SELECTOR, ".sea.live"))
        stage = browser.find_element(By.CSS_SELECTOR, ".stage")
        browser.execute_script("arguments[0].scrollIntoView({block: 'center'})", stage)
        settle(browser)
        return browser

    return open_page


def emulate(driver: Driver, width: int, scheme: str = "light", motion: str = "") -> None:
    features = [
        {"name": "prefers-color-scheme", "value": scheme},
        {"name": "prefers-reduced-motion", "value": motion},
    ]
    driver.execute_cdp_cmd("Emulation.setEmulatedMedia", {"features": features})
    screen = {"width": width, "height": 700, "deviceScaleFactor": 1, "mobile": width < 500}
    driver.execute_cdp_cmd("Emulation.setDeviceMetricsOverride", screen)


def settle(driver: Driver) -> None:
    """Wait until two pictures have been drawn."""
    script = "const done = arguments[0]; requestAnimationFrame(() => requestAnimationFrame(done))"
    driver.execute_async_script(script)


def picture(driver: Driver, selector: str = ".stage") -> Any:
    settle(driver)
    png = driver.find_element(By.CSS_SELECTOR, selector).screenshot_as_png
    return np.asarray(Image.open(io.BytesIO(png)).convert("RGB"), dtype=float)


def changed(one: Any, other: Any) -> float:
    """Share of the picture's points that differ."""
    return float((np.abs(one - other).max(axis=2) > 8).mean())


def control(driver: Driver, name: str) -> Any:
    return driver.find_element(By.NAME, name)


def value(driver: Driver) -> int:
    return int(control(driver, "time").get_property("value"))


def move_slider(driver: Driver, name: str, to: int) -> None:
    script = "arguments[0].value = arguments[1]; arguments[0].dispatchEvent(new Event('input'))"
    driver.execute_script(script, control(driver, name), to)


def test_no_error_is_told_and_no_request_leaves_the_file(look: Open, page: Path) -> None:
    driver = look()
    control(driver, "play").click()
    time.sleep(0.5)
    errors = [line for line in driver.get_log("browser") if line["level"] == "SEVERE"]
    assert errors == []
    events = [json.loads(line["message"])["message"] for line in driver.get_log("performance")]
    asked = [
        event["params"]["request"]["url"]
        for event in events
        if event["method"] == "Network.requestWillBeSent"
    ]
    assert page.as_uri() in asked
    assert all(url == page.as_uri() or url.startswith(("data:", "blob:")) for url in asked)


def test_a_sea_without_bodies_and_gauges_is_shown_too(look: Open, sea_alone: Path) -> None:
    driver = look(page=sea_alone)
    before = picture(driver)
    move_slider(driver, "time", 60)
    assert changed(before, picture(driver)) > 0.05
    assert [e for e in driver.get_log("browser") if e["level"] == "SEVERE"] == []


def test_its_policy_holds_in_the_browser(look: Open) -> None:
    driver = look()
    outcome = driver.execute_async_script(
        "const done = arguments[0];"
        "document.addEventListener('securitypolicyviolation', e => done(e.violatedDirective));"
        "fetch('http://127.0.0.1:9/').catch(() => setTimeout(() => done('refused late'), 500))"
    )
    assert outcome == "connect-src"


def played_on(driver: Driver, to: int) -> int:
    """Wait until the film plays and has come so far, however slow the machine; where it is."""
    script = (
        "return document.querySelector('[name=play]').innerText.trim() === 'Pause' &&"
        " Number(document.querySelector('[name=time]').value)"
    )

    def far_enough(driver: Driver) -> int | None:
        at = driver.execute_script(script)
        return at if at is not False and at >= to else None

    return int(WebDriverWait(driver, 20, poll_frequency=0.02).until(far_enough))


def test_it_stands_still_until_asked_then_plays_and_pauses_with_space(look: Open) -> None:
    driver = look()
    move_slider(driver, "time", 0)  # all of the film lies ahead: it cannot end while we look away
    begun, first = value(driver), picture(driver)
    time.sleep(0.7)
    assert value(driver) == begun
    assert changed(first, picture(driver)) == 0.0
    ActionChains(driver).send_keys(Keys.SPACE).perform()
    seen = played_on(driver, begun + 2)
    ActionChains(driver).send_keys(Keys.SPACE).perform()
    assert control(driver, "play").text == "Play"
    paused, still = value(driver), picture(driver)
    assert paused >= seen
    assert changed(first, still) > 0.01
    time.sleep(0.4)
    assert value(driver) == paused
    assert changed(still, picture(driver)) == 0.0


WATCH = """
const [span, done] = arguments, seen = [], begun = performance.now();
const slider = document.querySelector('[name=time]');
const told = document.querySelector('.time output');
document.querySelector('[name=play]').click();
const note = () => {
  const passed = (performance.now() - begun) / 1000;
  seen.push([passed, Number(told.textContent.split(' ')[2]), Number(slider.value)]);
  if (passed < span) return setTimeout(note, 50);
  document.querySelector('[name=play]').click();
  done(seen);
};
note();
"""


def test_the_button_plays_at_the_pace_of_the_clock(look: Open) -> None:
    driver = look()
    move_slider(driver, "time", 0)
    passed, told, _ = np.array(driver.execute_async_script(WATCH, 2.5)).T
    # it was drawn at some moment between two looks, which a busy machine takes seldom
    last = np.flatnonzero(np.diff(told))[-1]
    assert told[-1] > 1.0
    assert passed[last] - 0.4 < told[-1] < passed[last + 1] + 0.4


def test_the_slider_changes_the_picture(look: Open) -> None:
    driver = look()
    move_slider(driver, "time", 10)
    before = picture(driver)
    slider = control(driver, "time")
    slider.send_keys(*[Keys.ARROW_RIGHT] * 5)  # half a period on
    assert value(driver) == 15
    assert slider.get_attribute("aria-valuetext") == "t = 1.50 s"
    assert changed(before, picture(driver)) > 0.1
    move_slider(driver, "exaggeration", 10)
    high = picture(driver)
    move_slider(driver, "exaggeration", 1)
    assert changed(high, picture(driver)) > 0.05


def test_drag_wheel_and_keys_change_the_view_and_home_brings_it_back(look: Open) -> None:
    driver = look()
    canvas = driver.find_element(By.CSS_SELECTOR, ".stage canvas")
    canvas.send_keys(Keys.HOME)
    first = picture(driver)

    def drag() -> None:
        chain = ActionChains(driver).move_to_element(canvas).click_and_hold()
        chain.move_by_offset(120, 20).release().perform()

    def wheel() -> None:
        driver.execute_cdp_cmd(
            "Input.dispatchMouseEvent",
            {"type": "mouseWheel", "x": 450, "y": 350, "deltaX": 0, "deltaY": -300},
        )

    def key(name: str) -> Callable[[], None]:
        return lambda: canvas.send_keys(name)

    keys = [Keys.ARROW_LEFT, Keys.ARROW_UP, Keys.ARROW_DOWN, Keys.ARROW_RIGHT, "+", "-"]
    for act in (drag, wheel, *map(key, keys)):
        before = picture(driver)
        act()
        time.sleep(0.1)
        assert changed(before, picture(driver)) > 0.01, act
    canvas.send_keys(Keys.HOME)
    assert changed(first, picture(driver)) < 0.005
    canvas.send_keys("...,")
    assert value(driver) == 2


def test_the_canvas_holds_water_and_the_names_of_things(look: Open) -> None:
    driver = look()
    names = [span.text for span in driver.find_elements(By.CSS_SELECTOR, ".labels span")]
    assert {"buoy", "mark", "ahead", "over", "x → 7 m", "y → 5 m"} <= set(names)
    image = picture(driver, ".stage canvas")
    blue = (image[..., 2] > image[..., 0] + 30).mean()
    assert blue > 0.1


def test_names_stand_clear_of_one_another_and_inside_the_picture(look: Open) -> None:
    driver = look(360)
    holder = driver.find_element(By.CSS_SELECTOR, ".stage").rect
    spans = driver.find_elements(By.CSS_SELECTOR, ".labels span")
    boxes = [span.rect for span in spans if span.is_displayed()]
    assert len(boxes) >= 5
    for k, one in enumerate(boxes):
        assert one["x"] + one["width"] <= holder["x"] + holder["width"] + 1
        for other in boxes[:k]:
            gaps = [
                max(one[at], other[at]) - min(one[at] + one[size], other[at] + other[size])
                for at, size in (("x", "width"), ("y", "height"))
            ]
            assert max(gaps) > -0.5


def test_less_motion_means_a_still_a_second(look: Open) -> None:
    driver = look(motion="reduce")
    move_slider(driver, "time", 0)
    seen = np.array(driver.execute_async_script(WATCH, 2.8))
    steps = np.flatnonzero(np.diff(seen[:, 2]))
    assert 1 <= len(steps) <= 2
    assert seen[steps[0] + 1, 0] >= 0.95
    assert np.diff(seen[:, 2])[steps] == pytest.approx(10, abs=3)  # records a second


def test_without_webgl_it_says_so_and_keeps_its_maps(needs_browser: None, page: Path) -> None:
    driver = started("--disable-3d-apis")
    try:
        driver.get(page.as_uri())
        missing = driver.find_element(By.CSS_SELECTOR, ".missing")
        WebDriverWait(driver, 20).until(lambda d: missing.is_displayed())
        assert "no moving sea" in missing.text
        assert not control(driver, "play").is_displayed()
        assert driver.find_element(By.CSS_SELECTOR, "#figure-elevation-1 svg").is_displayed()
        assert [e for e in driver.get_log("browser") if e["level"] == "SEVERE"] == []
    finally:
        driver.quit()


@pytest.mark.parametrize("scheme", ["light", "dark"])
@pytest.mark.parametrize("width", [360, 900])
def test_it_is_legible(look: Open, width: int, scheme: str) -> None:
    driver = look(width, scheme=scheme)
    assert driver.execute_script("return document.documentElement.scrollWidth") <= width
    smallest = driver.execute_script(
        "return Math.min(...[...document.querySelectorAll('figure svg text')].map(t =>"
        " parseFloat(getComputedStyle(t).fontSize) * t.getScreenCTM().a || 99))"
    )
    assert smallest >= 6.5  # the numbers of gauges in a map; axes have more
    ground = picture(driver, "#trust")[5, 5]
    assert (ground.mean() < 60) if scheme == "dark" else (ground.mean() > 200)
    figure = picture(driver, "#figure-energy svg")
    # the curves' labels stand out from their ground, whichever it is
    assert np.ptp(figure.mean(axis=2)) > 150
    play = control(driver, "play")
    assert play.is_displayed()
    assert play.size["height"] >= 44
