// A button that fetches one file from the kernel; it never passes the server's disk.
function render({ model, el }) {
  const button = document.createElement("button");
  button.type = "button";
  button.className = "x-button x-download";
  button.textContent = model.get("text");
  button.title = model.get("hint");
  el.append(button);
  const press = () => model.send({ kind: "fetch" });
  button.addEventListener("click", press);
  const hear = (message, buffers) => {
    if (message.kind !== "file") return;
    const address = URL.createObjectURL(new Blob([buffers[0]], { type: message.type }));
    const link = document.createElement("a");
    link.href = address;
    link.download = message.name;
    link.click();
    setTimeout(() => URL.revokeObjectURL(address), 10000);
  };
  model.on("msg:custom", hear);
  return () => {
    button.removeEventListener("click", press);
    model.off("msg:custom", hear);
  };
}

export default { render };
