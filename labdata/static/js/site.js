// Small conveniences of every page. Everything also works without this file.

/** Closes an open menu on Escape or on a click elsewhere. */
function closeMenus(event) {
  for (const menu of document.querySelectorAll("details.menu[open]")) {
    if (event.type === "keydown" ? event.key === "Escape" : !menu.contains(event.target)) {
      const held = menu.contains(document.activeElement);
      menu.open = false;
      if (held && event.type === "keydown") menu.querySelector("summary").focus();
    }
  }
}

/** Asks before a form marked with data-confirm is sent. */
function askFirst(event) {
  const question = event.submitter?.dataset.confirm ?? event.target.dataset.confirm;
  if (question && !window.confirm(question)) event.preventDefault();
}

/** Copies the text of the element named by data-copy. */
async function copyText(event) {
  const button = event.target.closest("button[data-copy]");
  if (!button) return;
  await navigator.clipboard.writeText(document.querySelector(button.dataset.copy).textContent.trim());
  button.textContent = "Copied";
}

/** Lets a file be dropped on the zone around a file field. */
function acceptDrops(zone) {
  const field = zone.querySelector("input[type=file]");
  const over = (on) => (event) => { event.preventDefault(); zone.classList.toggle("over", on); };
  zone.addEventListener("dragover", over(true));
  zone.addEventListener("dragleave", over(false));
  zone.addEventListener("drop", (event) => {
    over(false)(event);
    if (event.dataTransfer.files.length) field.files = event.dataTransfer.files;
  });
}

document.addEventListener("click", closeMenus);
document.addEventListener("keydown", closeMenus);
document.addEventListener("submit", askFirst);
document.addEventListener("click", copyText);
for (const field of document.querySelectorAll("[data-submit-on-change]")) {
  field.addEventListener("change", () => field.form.requestSubmit());
}
document.querySelectorAll("[data-drop]").forEach(acceptDrops);

/** A table wider than its box can be scrolled by keyboard too. */
function openToKeys(box) {
  const wide = box.scrollWidth > box.clientWidth;
  box.toggleAttribute("tabindex", wide);
  if (wide) box.tabIndex = 0;
}

const boxes = new ResizeObserver((entries) => entries.forEach((entry) => openToKeys(entry.target)));
document.querySelectorAll(".table-box").forEach((box) => boxes.observe(box));
document.addEventListener("htmx:afterSwap", () => document.querySelectorAll(".table-box").forEach(openToKeys));
