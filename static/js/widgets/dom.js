// Building elements: text goes in as text, so that nothing typed can become markup.

/** An element; `on` holds listeners, false and null attributes are left out. */
export function el(tag, attributes = {}, ...children) {
  const made = document.createElement(tag);
  const { on = {}, ...rest } = attributes;
  for (const [name, value] of Object.entries(rest)) {
    if (value === false || value === null || value === undefined) continue;
    made.setAttribute(name, value === true ? "" : value);
  }
  for (const [name, listener] of Object.entries(on)) made.addEventListener(name, listener);
  made.append(...children.flat().filter((child) => child !== null && child !== undefined));
  return made;
}

/** Words for screen readers only. */
export function unseen(text) {
  return el("span", { class: "unseen" }, text);
}

/** The mark of a verdict, cloned from the page's own template. */
export function markOf(name) {
  const template = document.getElementById(`mark-${name}`);
  return template ? template.content.cloneNode(true) : "";
}

/** A picture drawn by the server, as an element; empty where it is none. */
export function svgOf(text) {
  const read = new DOMParser().parseFromString(text, "image/svg+xml");
  const drawn = read.documentElement;
  return drawn && drawn.localName === "svg" ? document.importNode(drawn, true) : "";
}
