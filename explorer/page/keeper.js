// Keeps the page's work in this browser, brings it back on the next visit, and hands out links to it.
const ROOM = "explorer page";

function stored() {
  try {
    return window.localStorage.getItem(ROOM) ?? "";
  } catch {
    return ""; // a browser that keeps nothing
  }
}

function store(text) {
  try {
    window.localStorage.setItem(ROOM, text);
    return true;
  } catch {
    return false;
  }
}

function address(fragment) {
  return window.location.pathname + window.location.search + (fragment ? `#${fragment}` : "");
}

function render({ model, el }) {
  const button = document.createElement("button");
  button.type = "button";
  button.className = "x-button x-linked";
  button.textContent = "Copy link";
  button.title = "A link that opens the page at this question; measured data is named in it, not carried";
  const said = document.createElement("span");
  said.className = "x-hidden";
  said.setAttribute("role", "status");
  el.append(button, said);
  let late = 0;
  const say = (words) => {
    button.textContent = said.textContent = words;
    clearTimeout(late);
    late = setTimeout(() => { button.textContent = "Copy link"; said.textContent = ""; }, 2500);
  };
  const press = () => model.send({ kind: "link" });
  button.addEventListener("click", press);

  const hear = async (message) => {
    if (message.kind === "keep" && !store(message.text)) model.send({ kind: "full" });
    if (message.kind === "link") {
      window.history.replaceState(null, "", address(message.text));
      try {
        await navigator.clipboard.writeText(window.location.href);
        say("Link copied");
      } catch {
        say("Link is in the address"); // without leave to write to the clipboard
      }
    }
    if (message.kind === "taken") window.history.replaceState(null, "", address(""));
  };
  model.on("msg:custom", hear);
  if (model.get("keeps")) {
    const link = window.location.hash.slice(1);
    if (link.startsWith("q=")) model.send({ kind: "open", text: link });
    else model.send({ kind: "open", text: "", kept: stored() });
  }
  return () => {
    clearTimeout(late);
    button.removeEventListener("click", press);
    model.off("msg:custom", hear);
  };
}

export default { render };
