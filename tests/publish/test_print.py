"""What hangs on a wall: pages printed by a browser."""

from __future__ import annotations

from collections.abc import Callable
from pathlib import Path
from typing import Any

import pytest
from click.testing import CliRunner

from moonwrit.cli import main
from moonwrit.resources import starter_folder

_PRINT = """
const {chromium} = require('playwright-core');
const [program, folder, ...addresses] = process.argv.slice(1);
(async () => {
  const browser = await chromium.launch({executablePath: program, args: ['--no-sandbox']});
  const page = await browser.newPage({colorScheme: 'dark'});
  await page.emulateMedia({media: 'print'});
  const found = {};
  for (const address of addresses) {
    await page.goto(`file://${folder}/${address}index.html`);
    const sheets = [];
    for (const format of ['A4', 'Letter']) {
      const pdf = (await page.pdf({format})).toString('latin1');
      sheets.push((pdf.match(/\\/Type\\s*\\/Page\\b/g) || []).length);
    }
    found[address] = {sheets, ...await page.evaluate(() => ({
      navigation: [...document.querySelectorAll('nav')].filter(nav => nav.checkVisibility()).length,
      ink: getComputedStyle(document.body).color,
      smallest: Math.min(...[...document.querySelectorAll('main *, footer *')]
        .filter(e => e.checkVisibility() && !e.closest('svg') && e.innerText)
        .map(e => parseFloat(getComputedStyle(e).fontSize))),
    }))};
  }
  console.log(JSON.stringify(found));
  await browser.close();
})();
"""

# The fullest of each kind: every odd night of Ramadan, three reports and a close call, the months of a year.
SHEETS = ("1448/", "1448/ramadan/", "1448/dhu-al-hijja/", "evenings/2025-10-22/", "evenings/2027-10-01/")


@pytest.mark.judge("playwright")
def test_a_month_an_evening_and_a_year_print_on_one_sheet_each(
    tmp_path: Path, node: Callable[..., Any], chromium: str
) -> None:
    """On A4 and on Letter alike, without navigation, black on white even where the screen is dark, in letters of
    at least 7 points."""
    site = tmp_path / "site"
    arguments = ["publish", "--content", str(starter_folder()), "--output", str(site), "--as-of", "2026-12-01"]
    done = CliRunner().invoke(main, arguments)
    assert done.exit_code == 0, done.output
    found = node(_PRINT, chromium, site, *SHEETS)
    assert list(found) == list(SHEETS)
    for address, printed in found.items():
        assert printed["sheets"] == [1, 1], address
        assert printed["navigation"] == 0, address
        assert printed["ink"] == "rgb(0, 0, 0)", address
        assert printed["smallest"] >= 7 * 96 / 72, (address, printed["smallest"])
