// Light or dark: a press changes it, this browser remembers it; without a choice the system decides.
const ROOM = "explorer look";

function remembered() {
  try {
    return window.localStorage.getItem(ROOM) ?? "";
  } catch {
    return "";
  }
}

function render({ el }) {
  const stop = new AbortController();
  const system = matchMedia("(prefers-color-scheme: dark)");
  const button = document.createElement("button");
  button.type = "button";
  button.className = "x-button x-look";
  button.textContent = "◐";
  el.append(button);
  let chosen = remembered();
  const dark = () => (chosen ? chosen === "dark" : system.matches);
  const wear = () => {
    const page = el.closest(".explorer");
    page?.classList.toggle("x-dark", chosen === "dark");
    page?.classList.toggle("x-light", chosen === "light");
    button.setAttribute("aria-pressed", String(dark()));
    button.title = dark() ? "Light page" : "Dark page";
    button.setAttribute("aria-label", "Dark page");
    document.documentElement.classList.toggle("explorer-dark", dark()); // maps watch it
    window.dispatchEvent(new Event("explorer-look")); // and plots hear this
  };
  button.addEventListener("click", () => {
    chosen = dark() ? "light" : "dark";
    try {
      window.localStorage.setItem(ROOM, chosen);
    } catch { /* it holds for this visit */ }
    wear();
  }, { signal: stop.signal });
  system.addEventListener("change", wear, { signal: stop.signal });
  requestAnimationFrame(wear); // once the button stands in the page
  return () => stop.abort();
}

export default { render };
