// The first day of every month of the Umm al-Qura calendar as ICU carries it, 1300-1600, found by asking ICU for
// the Hijri date of each civil day in turn. Prints JSON: {"source": ..., "rows": [[year, month, "starts"], ...]}.
"use strict";

const hijri = new Intl.DateTimeFormat("en-u-ca-islamic-umalqura-nu-latn", {
  timeZone: "UTC", year: "numeric", month: "numeric", day: "numeric",
});
const rows = [];
const end = Date.UTC(2174, 11, 31);
for (let day = Date.UTC(1882, 0, 1); day <= end; day += 86_400_000) {
  const of = Object.fromEntries(hijri.formatToParts(day).map(({ type, value }) => [type, value]));
  const year = Number(of.year);
  if (of.day === "1" && year >= 1300 && year <= 1600) {
    rows.push([year, Number(of.month), new Date(day).toISOString().slice(0, 10)]);
  }
}
console.log(JSON.stringify({ source: `ICU ${process.versions.icu}, in Node.js ${process.versions.node}`, rows }));
