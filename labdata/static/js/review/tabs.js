// Tabs that work with arrow keys.

export function tabs(box) {
  const all = [...box.querySelectorAll('[role="tab"]')];
  const show = (chosen) => {
    for (const tab of all) {
      tab.setAttribute("aria-selected", String(tab === chosen));
      tab.tabIndex = tab === chosen ? 0 : -1;
      document.getElementById(tab.getAttribute("aria-controls")).hidden = tab !== chosen;
    }
  };
  for (const [at, tab] of all.entries()) {
    tab.addEventListener("click", () => show(tab));
    tab.addEventListener("keydown", (event) => {
      const by = { ArrowRight: 1, ArrowLeft: -1 }[event.key];
      if (!by) return;
      const next = all[(at + by + all.length) % all.length];
      show(next); next.focus(); event.preventDefault();
    });
  }
  show(all[0]);
}
