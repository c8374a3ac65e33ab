// What was typed in a long form, kept on this tablet until it is recorded.

const SKIPPED = new Set(["form_token", "key", "rows", "do"]);

export function keep(form, place) {
  const typed = {};
  for (const field of form.elements) {
    if (field.name && !SKIPPED.has(field.name) && field.type !== "submit") typed[field.name] = field.value;
  }
  try {
    localStorage.setItem(place, JSON.stringify(typed));
  } catch {
    // a full or closed store: the form itself still holds everything
  }
}

// Returns whether anything that was typed stands in the form again.
export function restore(form, place) {
  let typed = null;
  try {
    typed = JSON.parse(localStorage.getItem(place) ?? "null");
  } catch {
    return false;
  }
  let changed = false;
  for (const [name, value] of Object.entries(typed ?? {})) {
    const field = form.elements.namedItem(name);
    if (!field || !("value" in field) || typeof value !== "string" || field.value === value) continue;
    field.value = value;
    changed = true;
  }
  return changed;
}

export function forget(place) {
  try {
    localStorage.removeItem(place);
  } catch {
    // nothing was kept
  }
}
