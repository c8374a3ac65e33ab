// Forms: a second tap sends nothing, what was refused has the focus, the present place is in view.

for (const form of document.querySelectorAll("form[method=post]")) {
  form.addEventListener("submit", (event) => {
    if (form.dataset.sent) return event.preventDefault();
    form.dataset.sent = "yes";
    for (const button of form.querySelectorAll("button[type=submit]")) button.setAttribute("aria-disabled", "true");
    return undefined;
  });
}

// A page that comes back from the browser's memory can be sent again; its key makes that harmless.
window.addEventListener("pageshow", () => {
  for (const form of document.querySelectorAll("form[data-sent]")) {
    delete form.dataset.sent;
    for (const button of form.querySelectorAll("[aria-disabled]")) button.removeAttribute("aria-disabled");
  }
});

document.querySelector("[aria-invalid=true], .problem")?.focus();

const present = document.querySelector(".places [aria-current]");
if (present) present.parentElement.parentElement.scrollLeft = present.offsetLeft - 16;

// A refusal leads back to the page where it happened, which still holds what was typed.
const back = document.getElementById("back");
if (back && history.length > 1) {
  back.hidden = false;
  back.addEventListener("click", () => history.back());
}

// What is folded away is printed, also by browsers that cannot do so by style alone.
const opened = new Set();
window.addEventListener("beforeprint", () => {
  for (const fold of document.querySelectorAll("main details:not([open])")) {
    opened.add(fold);
    fold.open = true;
  }
});
window.addEventListener("afterprint", () => {
  for (const fold of opened) fold.open = false;
  opened.clear();
});
