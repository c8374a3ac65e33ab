// What was typed in a long form, kept on this tablet until it is recorded.

const SKIPPED = new Set(["form_token", "key", "rows", "do", "name", "revision"]);
const NEVER = new Set(["submit", "password", "checkbox", "radio", "file"]);

export function keep(form, place) {
  const typed = {};
  for (const field of form.elements) {
    if (field.name && !SKIPPED.has(field.name) && !NEVER.has(field.type)) typed[field.name] = field.value;
  }
  try {
    localStorage.setItem(place, JSON.stringify(typed));
  } catch {
    // a full or closed store: the form itself still holds everything
  }
}

// Returns whether anything that was typed stands in the form again, and what has no field there.
export function restore(form, place) {
  let typed = null;
  try {
    typed = JSON.parse(localStorage.getItem(place) ?? "null");
  } catch {
    typed = null;
  }
  let changed = false;
  const homeless = {};
  for (const [name, value] of Object.entries(typed ?? {})) {
    if (typeof value !== "string") continue;
    const field = form.elements.namedItem(name);
    if (!field || !("value" in field) || field.type === "submit") {
      if (value) homeless[name] = value;
    } else if (field.value !== value) {
      field.value = value;
      changed = true;
    }
  }
  return { changed, homeless };
}

export function forget(place) {
  try {
    localStorage.removeItem(place);
  } catch {
    // nothing was kept
  }
}
