// Keys that work everywhere on the page, unless they are typed into a field.
const FIELDS = "input:not([type=file]):not([type=range]):not([type=checkbox]), textarea, select, [contenteditable=true]";

function render({ model, el }) {
  el.hidden = true;
  const stop = new AbortController();
  const hear = (event) => {
    const target = event.target instanceof Element ? event.target : document.body;
    if (!(event.ctrlKey || event.metaKey) || event.altKey || target.closest(FIELDS)) return;
    const home = el.closest(".explorer");
    if (target !== document.body && !home?.contains(target)) return;
    const key = event.key.toLowerCase();
    const kind = key === "y" || (key === "z" && event.shiftKey) ? "redo" : key === "z" ? "undo" : "";
    if (!kind) return;
    event.preventDefault();
    event.stopPropagation();
    model.send({ kind });
  };
  document.addEventListener("keydown", hear, { signal: stop.signal, capture: true });
  return () => stop.abort();
}

export default { render };
