// Read iCalendar files with ical.js or node-ical: node read_ical.js LIBRARY FILE... prints {file: [event...]}.
const fs = require("fs");
const [library, ...files] = process.argv.slice(2);
const pad = (number) => String(number).padStart(2, "0");
const local = (date) => `${date.getFullYear()}${pad(date.getMonth() + 1)}${pad(date.getDate())}`;
const stamp = (date) => date.toISOString().replace(/[-:]/g, "").replace(".000", "");

const readers = {
  "ical.js": (text) => {
    const ICAL = require("ical.js").default || require("ical.js");
    const calendar = new ICAL.Component(ICAL.parse(text));
    for (const zone of calendar.getAllSubcomponents("vtimezone"))
      ICAL.TimezoneService.register(zone);
    const when = (time) => (time.isDate ? time.toString().replace(/-/g, "") : stamp(time.toJSDate()));
    return calendar.getAllSubcomponents("vevent").map((component) => {
      const event = new ICAL.Event(component);
      return {
        uid: event.uid, starts: when(event.startDate), ends: when(event.endDate), title: event.summary,
        text: event.description, status: component.getFirstPropertyValue("status"), sequence: event.sequence,
      };
    });
  },
  "node-ical": (text) => {
    const when = (date) => (date.dateOnly ? local(date) : stamp(date));
    const plain = (value) => (typeof value === "object" ? value.val : value);
    return Object.values(require("node-ical").sync.parseICS(text)).filter((one) => one.type === "VEVENT").map((one) => ({
      uid: one.uid, starts: when(one.start), ends: when(one.end), title: plain(one.summary),
      text: plain(one.description), status: one.status, sequence: Number(one.sequence),
    }));
  },
};
const found = {};
for (const file of files) found[file] = readers[library](fs.readFileSync(file, "utf8"));
console.log(JSON.stringify(found));
