"""How tests set a what-if on a page and read what it says."""

FRAMES = "() => new Promise(done => requestAnimationFrame(() => requestAnimationFrame(done)))"
ANSWER = """() => {
  const now = fellspanWhatIf.last(), item = now.result;
  return {fraction: item.fraction, at: item.worstAt, extra: item.extra, name: now.found.criterion.name,
          rule: fellspanWhatIf.say.ruleWords(now), k: now.k, met: item.met, spare: item.spare,
          sentence: document.querySelector(".what-if-answer").textContent,
          callout: document.querySelector(".only-wide .what-if-layer .callout")?.textContent};
}"""


def opened(watch, report, number, *, width=1280, height=900):
    watched = watch(width, height)
    watched.page.goto(report.link_pages[number].as_uri())
    watched.page.evaluate(FRAMES)
    return watched


def quiet(watched):
    assert watched.messages == []
    assert watched.requests == []


def typed(page, **values):
    for name, value in values.items():
        page.fill(f"[data-box={name}]", str(value))
    page.evaluate(FRAMES)
    return page.evaluate(ANSWER)
