/** Hands texts to the reader as files, and reads files the reader chooses; nothing goes anywhere else. */

/** Larger files are refused before they are read. */
export const FILE_BYTES_MAX = 4_000_000;

export function saveText(name: string, text: string, type: string): void {
  const url = URL.createObjectURL(new Blob([text], { type }));
  const anchor = document.createElement('a');
  anchor.href = url;
  anchor.download = name;
  anchor.click();
  // the download has its own copy by then
  setTimeout(() => URL.revokeObjectURL(url), 10_000);
}

/** The text of a chosen file, or a sentence that says why it is not taken. */
export async function readFile(file: File): Promise<{ text: string } | { refusal: string }> {
  if (file.size > FILE_BYTES_MAX) {
    const size = (file.size / 1e6).toFixed(1);
    return {
      refusal: `${file.name} has ${size} MB; the page takes at most ${FILE_BYTES_MAX / 1e6} MB. The command line takes more.`,
    };
  }
  const text = await file.text();
  if (text.includes('\0')) {
    return { refusal: `${file.name} is not a text file.` };
  }
  return { text };
}
