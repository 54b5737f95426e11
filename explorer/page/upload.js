// A button that takes one file from the person and hands its bytes to the kernel; files can be dropped on it.
function render({ model, el }) {
  const stop = new AbortController();
  const on = (target, kind, run) => target.addEventListener(kind, run, { signal: stop.signal });
  const button = document.createElement("button");
  button.type = "button";
  button.className = "x-button x-upload";
  const pick = document.createElement("input");
  pick.type = "file";
  pick.hidden = true;
  pick.className = "x-pick";
  pick.accept = model.get("accept");
  el.append(button, pick);
  const name = () => {
    button.textContent = model.get("text");
    button.title = model.get("hint");
    pick.setAttribute("aria-label", model.get("text"));
  };
  name();
  model.on("change:text", name);
  model.on("change:hint", name);
  const give = async (file) => {
    if (!file) return;
    const title = file.name.slice(0, 200);
    if (file.size > model.get("largest")) {
      model.send({ kind: "too large", name: title, size: file.size });
      return;
    }
    try {
      model.send({ kind: "file", name: title }, {}, [await file.arrayBuffer()]);
    } catch {
      model.send({ kind: "unreadable", name: title });
    }
  };
  on(button, "click", () => pick.click());
  on(pick, "change", () => {
    give(pick.files[0]);
    pick.value = "";
  });
  on(button, "dragover", (event) => {
    event.preventDefault();
    button.classList.add("x-over");
  });
  on(button, "dragleave", () => button.classList.remove("x-over"));
  on(button, "drop", (event) => {
    event.preventDefault();
    button.classList.remove("x-over");
    give(event.dataTransfer.files[0]);
  });
  return () => {
    stop.abort();
    model.off("change:text", name);
    model.off("change:hint", name);
  };
}

export default { render };
