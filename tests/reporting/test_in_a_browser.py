"""The page as a browser shows it: wide, on a phone, in print, light and dark; and Word's file opened.

Chromium and LibreOffice are asked for by name on the path; where one is not found its tests are left out,
and pytest says so.
"""

from __future__ import annotations

import json
import re
import shutil
import subprocess
from pathlib import Path

import pytest

from beforehand import read_lock
from beforehand.reporting.context import context_of
from beforehand.reporting.writing import contents_of

PLANS = Path(__file__).parents[2] / "plans"
LOCKS = {path.name.removesuffix(".lock.yaml"): path for path in sorted(PLANS.glob("*/*.lock.yaml"))}
CHROMIUM = next(
    (found for name in ("chromium", "chromium-browser", "google-chrome") if (found := shutil.which(name))),
    None,
)
OFFICE = shutil.which("soffice") or shutil.which("libreoffice")

# Contrast by WCAG 2.2, 1.4.3: 4.5 to 1, or 3 to 1 for large text; relative luminance as it defines it.
LOOK = """
<script>
addEventListener("load", () => {
  const channel = (value) => { const c = value / 255; return c <= 0.04045 ? c / 12.92 : ((c + 0.055) / 1.055) ** 2.4; };
  const light = ([r, g, b]) => 0.2126 * channel(r) + 0.7152 * channel(g) + 0.0722 * channel(b);
  const parse = (text) => { const p = (text.match(/[\\d.]+/g) || []).map(Number); return p.length === 3 ? [...p, 1] : p; };
  const over = (top, under) => top.slice(0, 3).map((c, i) => c * top[3] + under[i] * (1 - top[3]));
  const ground = (node) => {
    for (let at = node; at; at = at.parentElement) {
      const c = parse(getComputedStyle(at).backgroundColor);
      if (c.length === 4 && c[3] > 0) return c.slice(0, 3);
    }
    return [255, 255, 255];
  };
  const faint = [];
  const walker = document.createTreeWalker(document.body, NodeFilter.SHOW_TEXT);
  while (walker.nextNode()) {
    const node = walker.currentNode, parent = node.parentElement;
    if (!node.data.trim() || ["SCRIPT", "STYLE", "TITLE", "DESC"].includes(parent.tagName.toUpperCase())) continue;
    const box = parent.getBoundingClientRect();
    if (!box.width || box.right < 0) continue;
    const style = getComputedStyle(parent), inside = parent.closest("svg");
    const under = ground(inside ? inside.parentElement : parent);
    let colour = parse(inside ? style.fill : style.color), strength = 1;
    for (let at = parent; at && at !== document.body; at = at.parentElement) strength *= Number(getComputedStyle(at).opacity);
    if (colour.length !== 4) continue;
    colour = over([colour[0], colour[1], colour[2], colour[3] * strength], under);
    const [high, low] = [light(colour), light(under)].sort((a, b) => b - a);
    const ratio = (high + 0.05) / (low + 0.05), size = parseFloat(style.fontSize);
    const large = size >= 24 || (size >= 18.66 && Number(style.fontWeight) >= 700);
    if (ratio < (large ? 3 : 4.5) - 0.01) faint.push(node.data.trim().slice(0, 40) + " " + ratio.toFixed(2));
  }
  const wide = [...document.querySelectorAll("body *")].filter((node) => {
    if (node.closest("svg") && node.tagName !== "svg") return false;
    if (node.closest(".wide, .drawn") || node.classList.contains("skip")) return false;
    return node.getBoundingClientRect().right > innerWidth + 1;
  }).map((node) => node.tagName + " " + (node.textContent || "").trim().slice(0, 40));
  const found = document.createElement("pre");
  found.id = "found";
  found.textContent = JSON.stringify({
    faint: [...new Set(faint)], wide, scrolls: document.documentElement.scrollWidth > innerWidth + 1,
    svgs: document.querySelectorAll("svg").length,
    empty: [...document.querySelectorAll("svg")].filter((svg) => svg.getBoundingClientRect().height < 20).length,
  });
  document.body.append(found);
});
</script>
"""  # noqa: E501 - a script
DARK, PRINT = "@media (prefers-color-scheme: dark)", "@media print"


def browsed(page: str, folder: Path, width: int) -> dict[str, object]:
    """What the page measures of itself in a window of some width; any message of the console is a fault."""
    path = folder / "page.html"
    path.write_text(page.replace("</body>", f"{LOOK}</body>"), encoding="utf-8")
    done = subprocess.run(
        [
            str(CHROMIUM), "--headless", "--no-sandbox", "--disable-gpu", "--enable-logging=stderr", "--v=0",
            f"--user-data-dir={folder / 'profile'}", f"--window-size={width},1200",
            "--virtual-time-budget=20000", "--dump-dom", path.as_uri(),
        ],
        capture_output=True, text=True, timeout=180, check=True,
    )  # fmt: skip
    assert "CONSOLE" not in done.stderr, done.stderr
    found = re.search(r'<pre id="found">(.*?)</pre>', done.stdout, re.DOTALL)
    assert found is not None
    measured: dict[str, object] = json.loads(
        found.group(1).replace("&amp;", "&").replace("&lt;", "<").replace("&gt;", ">")
    )
    return measured


@pytest.fixture(scope="module")
def pages() -> dict[str, str]:
    """The page of every ready plan."""
    return {
        name: contents_of(context_of(read_lock(path), path), ("html",))["html"].decode()
        for name, path in LOCKS.items()
    }


@pytest.mark.skipif(CHROMIUM is None, reason="no Chromium on the path: the page is not looked at")
@pytest.mark.parametrize("name", ["cold-rooms", "visits", "jobs", "samplings"])
@pytest.mark.parametrize(("look", "width"), [("light", 1280), ("dark", 1280), ("phone", 500), ("print", 794)])
def test_the_page_can_be_read(pages, tmp_path, name, look, width):
    """Nothing runs over its edge, nothing is too faint, no picture is empty, the console is silent."""
    page = pages[name]
    if look == "dark":
        page = page.replace(DARK, "@media all")
    if look == "print":
        page = page.replace(PRINT, "@media all")
    found = browsed(page, tmp_path, width)
    assert found["faint"] == []
    assert found["wide"] == []
    assert found["scrolls"] is False
    assert found["empty"] == 0
    assert isinstance(found["svgs"], int)
    assert found["svgs"] >= 3


@pytest.mark.skipif(CHROMIUM is None, reason="no Chromium on the path: the page is not printed")
def test_the_page_prints(pages, tmp_path):
    """To a PDF of several pages."""
    path, out = tmp_path / "page.html", tmp_path / "page.pdf"
    path.write_text(pages["jobs"], encoding="utf-8")
    subprocess.run(
        [
            str(CHROMIUM), "--headless", "--no-sandbox", "--disable-gpu", f"--user-data-dir={tmp_path / 'p'}",
            f"--print-to-pdf={out}", path.as_uri(),
        ],
        capture_output=True, timeout=180, check=True,
    )  # fmt: skip
    content = out.read_bytes()
    assert content.startswith(b"%PDF")
    assert len(re.findall(rb"/Type\s*/Page\b", content)) >= 3


@pytest.mark.skipif(OFFICE is None, reason="no LibreOffice on the path: the Word file is not opened")
def test_the_word_file_opens(tmp_path):
    """In another program than the one that wrote it."""
    path = tmp_path / "jobs.docx"
    lock = LOCKS["jobs"]
    path.write_bytes(contents_of(context_of(read_lock(lock), lock), ("docx",))["docx"])
    subprocess.run(
        [
            str(OFFICE), f"-env:UserInstallation={(tmp_path / 'profile').as_uri()}", "--headless",
            "--convert-to", "pdf", "--outdir", str(tmp_path), str(path),
        ],
        capture_output=True, timeout=240, check=True,
    )  # fmt: skip
    assert (tmp_path / "jobs.pdf").read_bytes().startswith(b"%PDF")
