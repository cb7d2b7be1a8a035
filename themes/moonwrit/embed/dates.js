// Coming dates for <moonwrit-dates count="5">; what stands in the element shows where this cannot. {{ address }}
(() => {
  const data = {{ data }};
  const style = new CSSStyleSheet();
  style.replaceSync(`:host{display:block}p{margin:0 0 .5em}ul{list-style:none;margin:0;padding:0}
li{padding-block:.45em;border-block-start:1px solid;border-color:color-mix(in srgb,currentColor 25%,transparent)}
a{color:inherit}a:focus-visible{outline:2px solid;outline-offset:2px}span{display:block}`);
  const today = () => {
    const now = new Date();
    return new Date(Date.UTC(now.getFullYear(), now.getMonth(), now.getDate())).toISOString().slice(0, 10);
  };
  const add = (parent, name, text, attributes = {}) => {
    const made = document.createElement(name);
    if (text) made.textContent = text;
    for (const [key, value] of Object.entries(attributes)) made.setAttribute(key, value);
    return parent.appendChild(made);
  };
  class Dates extends HTMLElement {
    connectedCallback() {
      const now = this.getAttribute("today") || today();
      const coming = data.dates.filter((one) => one[1] >= now).slice(0, Number(this.getAttribute("count")) || 5);
      if (!coming.length || this.shadowRoot) return;
      const root = this.attachShadow({ mode: "open" });
      root.adoptedStyleSheets = [style];
      const all = add(root, "section", "", { lang: data.lang, dir: data.dir, "aria-label": data.title, part: "dates" });
      const days = (from) => Math.round((Date.parse(now) - Date.parse(from)) / 864e5);
      const month = data.months.find(([from, length]) => from <= now && days(from) < length);
      if (month) add(all, "p", `${days(month[0]) + 1} ${month[2]}`, { part: "today" });
      const list = add(all, "ul", "", { role: "list", part: "list" });
      for (const [, , title, when, standing, path] of coming) {
        const item = add(list, "li", "", { part: "date" });
        add(item, "a", title, { href: data.site + path, target: "_top", part: "title" });
        add(item, "span", `${when} (${standing})`, { part: "when" });
      }
      add(add(all, "p", "", { part: "source" }), "a", data.title, { href: data.site, target: "_top" });
    }
  }
  customElements.get("moonwrit-dates") || customElements.define("moonwrit-dates", Dates);
})();
