#!/usr/bin/env python3
"""Opens a report in headless Chromium and looks at it as a reader would.

    page.py FILE.html [--figures N] [--shots DIR]

It fails where the page logs anything, asks for anything but itself, lacks a
figure, runs out of a narrow screen, or breaks the basics for keyboard and screen
reader: headings in order, named figures, tables with captions and scoped
headings, contrast. With --shots it leaves screenshots and the printed page.

Only Python and Chromium are needed: it speaks the DevTools protocol over pipes.
"""
import argparse
import base64
import json
import os
import pathlib
import shutil
import subprocess
import sys
import tempfile

LOOK = r"""
(() => {
  const wrong = [];
  const say = (what, e) => wrong.push(what + ": " + (e && e.outerHTML ? e.outerHTML.slice(0, 120) : e));
  if (document.documentElement.lang !== "en") say("no language", document.documentElement.lang);
  if (!document.title.trim()) say("no title", "");
  if (document.scripts.length) say("a script", document.scripts[0]);
  for (const e of document.querySelectorAll("img,iframe,object,embed,link,video,audio,form,input,button")) say("a foreign element", e);
  for (const e of document.querySelectorAll("*")) for (const a of e.attributes) {
    if (a.name.startsWith("on")) say("a handler", e);
    if (["href", "src", "xlink:href"].includes(a.name) && !a.value.startsWith("#")) say("a link that leads away", e);
  }
  const ids = new Set();
  for (const e of document.querySelectorAll("[id]")) { if (ids.has(e.id)) say("id twice", e); ids.add(e.id); }
  for (const e of document.querySelectorAll("[aria-labelledby]")) if (!ids.has(e.getAttribute("aria-labelledby"))) say("label that is not there", e);
  for (const e of document.querySelectorAll("a[href^='#']")) if (!ids.has(e.getAttribute("href").slice(1))) say("link to nothing", e);

  let level = 0;
  for (const e of document.querySelectorAll("h1,h2,h3,h4,h5,h6")) {
    const n = +e.tagName[1];
    if (n > level + 1) say("heading that skips a level", e);
    if (!e.textContent.trim()) say("empty heading", e);
    level = n;
  }
  if (document.querySelectorAll("h1").length !== 1) say("not one h1", document.querySelectorAll("h1").length);
  if (document.querySelectorAll("main").length !== 1) say("not one main", "");

  for (const t of document.querySelectorAll("table")) {
    if (!t.caption || !t.caption.textContent.trim()) say("table without caption", t);
    for (const th of t.querySelectorAll("th")) if (!["col", "row"].includes(th.scope)) say("heading without scope", th);
    const head = t.tHead.rows[0].cells.length;
    for (const r of t.tBodies[0].rows) {
      if (r.cells.length !== head) say("row of " + r.cells.length + " cells below " + head, r);
      if (r.cells[0].tagName !== "TH") say("row without heading", r);
      for (const c of r.cells) if (!c.textContent.trim()) say("empty cell", r);
    }
  }

  const figures = document.querySelectorAll("figure");
  for (const f of figures) {
    const s = f.querySelector("svg");
    if (!s || s.getAttribute("role") !== "img" || !s.getAttribute("aria-label") || !s.querySelector("desc").textContent.trim()) { say("figure without a name", f); continue; }
    if (!f.querySelector("figcaption").textContent.trim()) say("figure without caption", f);
    const box = s.getBoundingClientRect();
    if (box.width < 100 || box.height < 80 || s.querySelectorAll("path").length < 5) say("figure that shows nothing", s);
    for (const t of s.querySelectorAll("text")) {
      const r = t.getBoundingClientRect();
      if (r.left < box.left - 1 || r.right > box.right + 1 || r.top < box.top - 1 || r.bottom > box.bottom + 1) say("words that stick out of " + s.getAttribute("aria-label"), t);
    }
  }

  // Contrast of all text by the colours as they came out (WCAG 2.2, 1.4.3).
  const rgb = c => { const m = c.match(/[\d.]+/g).map(Number); return m.length < 4 ? [...m, 1] : m; };
  const lum = c => { const f = v => (v /= 255) <= 0.04045 ? v / 12.92 : ((v + 0.055) / 1.055) ** 2.4; return 0.2126 * f(c[0]) + 0.7152 * f(c[1]) + 0.0722 * f(c[2]); };
  let least = 21;
  const walk = document.createTreeWalker(document.body, NodeFilter.SHOW_TEXT);
  while (walk.nextNode()) {
    const e = walk.currentNode.parentElement;
    if (!walk.currentNode.textContent.trim() || ["title", "desc", "STYLE"].includes(e.tagName)) continue;
    const style = getComputedStyle(e), svg = e.closest("svg");
    let back = [255, 255, 255, 1];
    for (let b = svg ? null : e; b; b = b.parentElement) { const c = rgb(getComputedStyle(b).backgroundColor); if (c[3] > 0) { back = c; break; } }
    const a = lum(rgb(svg ? style.fill : style.color)), b = lum(back);
    const ratio = (Math.max(a, b) + 0.05) / (Math.min(a, b) + 0.05);
    least = Math.min(least, ratio);
    if (ratio < 4.5) say("contrast " + ratio.toFixed(2), e);
  }
  return JSON.stringify({wrong, figures: figures.length, tables: document.querySelectorAll("table").length, headings: document.querySelectorAll("h1,h2,h3").length, least, height: document.documentElement.scrollHeight, over: document.documentElement.scrollWidth - innerWidth});
})()
"""


class Browser:
    def __init__(self, binary, home):
        to_read, self.to = os.pipe()
        self.back, back_write = os.pipe()
        # The protocol wants the pipes as 3 and 4; high numbers first, so that
        # neither is closed before it is copied.
        script = f'exec 13<&{to_read} 14>&{back_write} 3<&13 4>&14; exec "$@"'
        self.process = subprocess.Popen(
            ["bash", "-c", script, "sh", binary, "--headless", "--no-sandbox", "--disable-gpu", "--remote-debugging-pipe", f"--user-data-dir={home}",
             "--no-first-run", "--disable-background-networking", "--disable-component-update", "about:blank"],
            pass_fds=(to_read, back_write), stdout=subprocess.DEVNULL, stderr=subprocess.DEVNULL)
        os.close(to_read)
        os.close(back_write)
        self.number, self.rest, self.events = 0, b"", []

    def read(self):
        while b"\0" not in self.rest:
            more = os.read(self.back, 1 << 20)
            if not more:
                sys.exit("Chromium went away")
            self.rest += more
        text, self.rest = self.rest.split(b"\0", 1)
        return json.loads(text)

    def call(self, method, session=None, **params):
        self.number += 1
        message = {"id": self.number, "method": method, "params": params}
        if session:
            message["sessionId"] = session
        data = json.dumps(message).encode() + b"\0"
        while data:
            data = data[os.write(self.to, data):]
        while True:
            answer = self.read()
            if answer.get("id") == self.number:
                if "error" in answer:
                    sys.exit(f"{method}: {answer['error']}")
                return answer["result"]
            self.events.append(answer)

    def wait(self, method):
        for event in self.events:
            if event.get("method") == method:
                return
        while True:
            event = self.read()
            self.events.append(event)
            if event.get("method") == method:
                return


def main():
    flags = argparse.ArgumentParser()
    flags.add_argument("file")
    flags.add_argument("--figures", type=int)
    flags.add_argument("--shots")
    o = flags.parse_args()
    binary = shutil.which("chromium") or shutil.which("chromium-browser")
    if not binary:
        sys.exit("page.py needs Chromium (Debian: apt-get install chromium)")
    url = pathlib.Path(o.file).resolve().as_uri()
    wrong = []
    with tempfile.TemporaryDirectory(ignore_cleanup_errors=True) as home:
        b = Browser(binary, home)
        try:
            target = b.call("Target.createTarget", url="about:blank")["targetId"]
            session = b.call("Target.attachToTarget", targetId=target, flatten=True)["sessionId"]
            call = lambda method, **params: b.call(method, session, **params)
            for domain in ("Page", "Runtime", "Log", "Network", "Accessibility"):
                call(domain + ".enable")
            look = lambda: json.loads(call("Runtime.evaluate", expression=LOOK)["result"]["value"])
            screen = lambda w, h: call("Emulation.setDeviceMetricsOverride", width=w, height=h, deviceScaleFactor=1, mobile=False)
            shots = pathlib.Path(o.shots) if o.shots else None
            if shots:
                shots.mkdir(parents=True, exist_ok=True)

            screen(1100, 900)
            b.events.clear()
            call("Page.navigate", url=url)
            b.wait("Page.loadEventFired")
            found = look()
            wrong += found["wrong"]
            if o.figures is not None and found["figures"] != o.figures:
                wrong.append(f"{found['figures']} figures, not {o.figures}")
            if found["figures"] == 0:
                wrong.append("no figure at all")
            for width in (1100, 400):
                screen(width, 900)
                seen = look()
                if seen["over"] > 0:
                    wrong.append(f"{width} px wide, it runs over by {seen['over']} px")
                if shots:
                    high = min(seen["height"], 16000)
                    screen(width, high)
                    picture = call("Page.captureScreenshot", format="png")
                    (shots / f"screen-{width}.png").write_bytes(base64.b64decode(picture["data"]))
            screen(1100, 900)

            # The keyboard: the first stop leads past the head, the others follow
            # and none holds the reader.
            stops = []
            for _ in range(found["tables"] + 20):
                for kind in ("keyDown", "keyUp"):
                    call("Input.dispatchKeyEvent", type=kind, key="Tab", code="Tab", windowsVirtualKeyCode=9)
                at = call("Runtime.evaluate", expression="(e => e === document.body ? '' : e.tagName + ' ' + (e.className || e.getAttribute('aria-label') || e.textContent).slice(0, 60))(document.activeElement)")["result"]["value"]
                if at == "":
                    break
                stops.append(at)
            if not stops or stops[0] != "A skip":
                wrong.append(f"Tab first stops at {stops[:1]}, not at the link past the head")
            if len(stops) < found["tables"]:
                wrong.append(f"Tab reaches {len(stops)} stops, fewer than the {found['tables']} tables, which can be scrolled")

            # What a screen reader is told.
            named = [n for n in call("Accessibility.getFullAXTree")["nodes"] if n.get("role", {}).get("value") in ("image", "img")]
            if len(named) != found["figures"] or not all(n.get("name", {}).get("value") for n in named):
                wrong.append(f"a screen reader finds {len(named)} named pictures of {found['figures']}")

            for paper, (w, h) in {"a4": (8.27, 11.69), "letter": (8.5, 11)}.items():
                pdf = base64.b64decode(call("Page.printToPDF", paperWidth=w, paperHeight=h, printBackground=True, preferCSSPageSize=True)["data"])
                if not pdf.startswith(b"%PDF") or len(pdf) < 20000:
                    wrong.append(f"printed on {paper} it is empty")
                if shots:
                    (shots / f"print-{paper}.pdf").write_bytes(pdf)
            for event in b.events:
                method, params = event.get("method", ""), event.get("params", {})
                if method == "Network.requestWillBeSent" and params["request"]["url"] != url:
                    wrong.append("asked for " + params["request"]["url"][:200])
                elif method in ("Runtime.consoleAPICalled", "Runtime.exceptionThrown", "Log.entryAdded", "Network.loadingFailed"):
                    wrong.append(method + ": " + json.dumps(params)[:300])
        finally:
            b.process.terminate()
            b.process.wait()
    for line in wrong[:40]:
        print("WRONG", line)
    if wrong:
        sys.exit(f"{o.file}: {len(wrong)} things are wrong")
    print(f"{o.file}: {found['figures']} figures, {found['tables']} tables, {found['headings']} headings, {len(stops)} stops of Tab; "
          f"nothing logged, nothing asked for; least contrast {found['least']:.2f}")


main()
