// The look a person chose for this device; loaded before the page is painted, so that it never flashes.
(() => {
  const KEY = "titrant-ledger/look";
  const LOOKS = ["device", "light", "dark"];
  const kept = () => {
    try {
      return LOOKS.includes(localStorage.getItem(KEY)) ? localStorage.getItem(KEY) : "device";
    } catch {
      return "device";
    }
  };
  const wear = (look) => {
    if (look === "device") delete document.documentElement.dataset.look;
    else document.documentElement.dataset.look = look;
  };
  wear(kept());
  document.addEventListener("DOMContentLoaded", () => {
    const choice = document.getElementById("look");
    if (!choice) return;
    choice.value = kept();
    choice.closest("[hidden]")?.removeAttribute("hidden");
    choice.addEventListener("change", () => {
      wear(choice.value);
      try {
        localStorage.setItem(KEY, choice.value);
      } catch {
        // Without storage the choice lasts as long as the page.
      }
    });
  });
})();
