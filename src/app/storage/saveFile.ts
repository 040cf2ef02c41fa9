/** Hands a file to the browser's download. */
export function saveFile(name: string, content: string | Uint8Array<ArrayBuffer> | Blob, type: string): void {
  const blob = content instanceof Blob ? content : new Blob([content], { type });
  const url = URL.createObjectURL(blob);
  const link = document.createElement('a');
  link.href = url;
  link.download = name;
  link.click();
  // The browser has taken the blob by then; some need it a moment longer.
  setTimeout(() => URL.revokeObjectURL(url), 10_000);
}

/** A value as a JSON file of ours. */
export function saveJson(name: string, value: unknown): void {
  saveFile(name, `${JSON.stringify(value, null, 2)}\n`, 'application/json');
}

/** A text as part of a file's name. */
export function fileStem(text: string): string {
  const stem = text
    .normalize('NFKD')
    .replace(/[^A-Za-z0-9]+/g, '-')
    .replace(/^-+|-+$/g, '')
    .toLowerCase();
  return stem === '' ? 'unnamed' : stem.slice(0, 60);
}
