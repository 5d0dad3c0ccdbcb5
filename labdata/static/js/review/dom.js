// Making elements without markup in strings.

/** `make("p", {class: "note"}, "text", child)`; a property named on… is a listener. */
export function make(tag, props = {}, ...children) {
  const element = document.createElement(tag);
  for (const [name, value] of Object.entries(props)) {
    if (value === null || value === undefined || value === false) continue;
    if (name.startsWith("on")) element.addEventListener(name.slice(2), value);
    else element.setAttribute(name, value === true ? "" : value);
  }
  element.append(...children.filter((child) => child !== null && child !== undefined));
  return element;
}

export const plural = (count, word, words = `${word}s`) => `${count.toLocaleString("en-GB")} ${count === 1 ? word : words}`;

export const when = (text) => `${text.slice(0, 10)} ${text.slice(11, 16)} UTC`;

/** Buttons of which one is pressed. */
export function oneOf(buttons, chosen, tell) {
  const press = (value) => { for (const button of buttons) button.setAttribute("aria-pressed", String(button.value === value)); tell(value); };
  for (const button of buttons) button.addEventListener("click", () => press(button.value));
  press(chosen);
  return press;
}
