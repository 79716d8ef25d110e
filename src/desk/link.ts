/**
 * The state of the page as a link: circuits and options in the fragment of the address, which a browser
 * never sends anywhere. Compressed by the browser's own deflate, written in base64url.
 */
export type Linked = {
  page: string;
  texts: Record<string, string>;
  settings: Record<string, string>;
};

const VERSION = 'w1.';
/** Longer fragments are not read: nobody writes such a circuit into an address. */
const FRAGMENT_LENGTH_MAX = 200_000;
/** What a fragment may unpack to, in characters. */
const TEXT_LENGTH_MAX = 2_000_000;

export async function toFragment(state: Linked): Promise<string> {
  const bytes = new TextEncoder().encode(JSON.stringify(state));
  const packed = await through(bytes, new CompressionStream('deflate-raw'), TEXT_LENGTH_MAX);
  let binary = '';
  for (const byte of packed) binary += String.fromCharCode(byte);
  return VERSION + btoa(binary).replaceAll('+', '-').replaceAll('/', '_').replaceAll('=', '');
}

/** The state in a fragment (without its `#`), or null when there is none or it cannot be read. */
export async function fromFragment(fragment: string): Promise<Linked | null> {
  if (!fragment.startsWith(VERSION) || fragment.length > FRAGMENT_LENGTH_MAX) return null;
  try {
    const text = fragment.slice(VERSION.length).replaceAll('-', '+').replaceAll('_', '/');
    const packed = Uint8Array.from(atob(text), (letter) => letter.charCodeAt(0));
    const bytes = await through(packed, new DecompressionStream('deflate-raw'), TEXT_LENGTH_MAX);
    return checked(JSON.parse(new TextDecoder().decode(bytes)));
  } catch {
    // a damaged link is no fault of the reader: the page opens with its first example and says so
    return null;
  }
}

async function through(
  bytes: Uint8Array,
  stream: CompressionStream | DecompressionStream,
  lengthMax: number,
): Promise<Uint8Array> {
  const writer = stream.writable.getWriter();
  // errors of the writing side come out of the reading side too
  writer.write(bytes as Uint8Array<ArrayBuffer>).catch(() => {});
  writer.close().catch(() => {});
  const reader = stream.readable.getReader();
  const parts: Uint8Array[] = [];
  let length = 0;
  for (let next = await reader.read(); !next.done; next = await reader.read()) {
    length += next.value.length;
    if (length > lengthMax) throw new RangeError(`more than ${lengthMax} bytes in a link`);
    parts.push(next.value);
  }
  const out = new Uint8Array(length);
  let at = 0;
  for (const part of parts) {
    out.set(part, at);
    at += part.length;
  }
  return out;
}

/** Only strings where strings belong; everything else is refused. */
function checked(value: unknown): Linked | null {
  const { page, texts, settings } = (value ?? {}) as Partial<Linked>;
  const isWords = (part: unknown): part is Record<string, string> =>
    typeof part === 'object' &&
    part !== null &&
    !Array.isArray(part) &&
    Object.values(part).every((word) => typeof word === 'string');
  if (typeof page !== 'string' || !isWords(texts) || !isWords(settings)) return null;
  return { page, texts, settings };
}
