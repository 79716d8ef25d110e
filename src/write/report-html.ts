/**
 * Writes a report as one HTML page that stands alone: no script, nothing to load, prints well, follows the
 * reader's choice of light or dark. Keys of the JSON report become headings, lists of objects become tables,
 * tables of numbers become grids; pictures (SVG text made by ourselves) are set between.
 */
type Json = null | boolean | number | string | readonly Json[] | { readonly [key: string]: Json };

export type HtmlOptions = {
  title: string;
  /** The answer in one sentence, shown large at the top. */
  summary: string;
  /** SVG text with a caption each. */
  pictures?: readonly { caption: string; svg: string }[];
};

const STYLE = `
:root { color-scheme: light dark; --ink: light-dark(#1c1f24, #e8e6e1); --soft: light-dark(#5d6470, #a5a9b0);
  --rule: light-dark(#d9d9d4, #3b3f46); --paper: light-dark(#fdfdfb, #17191c); }
body { margin: 3rem auto; max-width: 60rem; padding: 0 1.25rem; background: var(--paper); color: var(--ink);
  font: 1rem/1.55 Georgia, "Times New Roman", serif; }
h1 { font-size: 1.1rem; font-weight: normal; color: var(--soft); }
.summary { font-size: 1.5rem; line-height: 1.35; margin: 0 0 2rem; }
h2 { font-size: 1rem; margin: 2rem 0 .5rem; border-top: 1px solid var(--rule); padding-top: .75rem; }
table { border-collapse: collapse; font-variant-numeric: tabular-nums; font-size: .9rem; }
th, td { text-align: left; padding: .2rem 1rem .2rem 0; vertical-align: top; }
th { font-weight: normal; color: var(--soft); }
td.number { text-align: right; }
figure { margin: 1.5rem 0; overflow-x: auto; }
figcaption { color: var(--soft); font-size: .9rem; }
.wide { overflow-x: auto; }
@media print { body { margin: 0; max-width: none; } h2, figure, tr { break-inside: avoid; } }
`;

/** The whole page. The report must be plain JSON data. */
export function reportHtml(report: object, { title, summary, pictures = [] }: HtmlOptions): string {
  const figures = pictures.map(
    ({ caption, svg }) => `<figure>${svg}<figcaption>${escapeHtml(caption)}</figcaption></figure>`,
  );
  const simple: [string, Json][] = [];
  const sections: string[] = [];
  for (const [key, value] of Object.entries(report) as [string, Json][]) {
    if (value === null || typeof value !== 'object') simple.push([key, value]);
    else sections.push(`<h2>${escapeHtml(words(key))}</h2>${render(value)}`);
  }
  return [
    '<!doctype html>',
    '<html lang="en"><head><meta charset="utf-8">',
    '<meta name="viewport" content="width=device-width, initial-scale=1">',
    `<title>${escapeHtml(title)}</title><style>${STYLE}</style></head><body>`,
    `<h1>${escapeHtml(title)}</h1>`,
    `<p class="summary">${escapeHtml(summary)}</p>`,
    ...figures,
    pairs(simple),
    ...sections,
    '</body></html>',
    '',
  ].join('\n');
}

export function escapeHtml(text: string): string {
  return text
    .replaceAll('&', '&amp;')
    .replaceAll('<', '&lt;')
    .replaceAll('>', '&gt;')
    .replaceAll('"', '&quot;');
}

/** `twoQubitDepth` becomes `two qubit depth`. */
function words(key: string): string {
  return key.replace(/([a-z])([A-Z])/g, '$1 $2').toLowerCase();
}

function render(value: Json): string {
  if (value === null || typeof value !== 'object') return escapeHtml(textOf(value));
  if (!isList(value)) return pairs(Object.entries(value));
  if (value.length === 0) return '<p>none</p>';
  const [first] = value;
  if (isList(first)) return grid(value as readonly (readonly Json[])[]); // rows of one table
  if (first !== null && typeof first === 'object') return table(value as readonly { [key: string]: Json }[]); // biome-ignore format: rows of one kind
  return `<ul>${value.map((item) => `<li>${escapeHtml(textOf(item))}</li>`).join('')}</ul>`;
}

function isList(value: Json | undefined): value is readonly Json[] {
  return Array.isArray(value);
}

function pairs(entries: readonly (readonly [string, Json])[]): string {
  const rows = entries.map(
    ([key, value]) => `<tr><th scope="row">${escapeHtml(words(key))}</th>${cell(value)}</tr>`,
  );
  return `<div class="wide"><table>${rows.join('')}</table></div>`;
}

function table(rows: readonly { readonly [key: string]: Json }[]): string {
  const keys = [...new Set(rows.flatMap((row) => Object.keys(row)))];
  const head = keys.map((key) => `<th scope="col">${escapeHtml(words(key))}</th>`).join('');
  const body = rows.map((row) => `<tr>${keys.map((key) => cell(row[key] ?? null)).join('')}</tr>`);
  return `<div class="wide"><table><tr>${head}</tr>${body.join('')}</table></div>`;
}

function grid(rows: readonly (readonly Json[])[]): string {
  const columns = Math.max(...rows.map((row) => row.length));
  const head = Array.from({ length: columns }, (_, k) => `<th scope="col">${k}</th>`).join('');
  const body = rows.map(
    (row, k) => `<tr><th scope="row">${k}</th>${row.map((value) => cell(value)).join('')}</tr>`,
  );
  return `<div class="wide"><table><tr><th></th>${head}</tr>${body.join('')}</table></div>`;
}

function cell(value: Json): string {
  if (typeof value === 'number') return `<td class="number">${textOf(value)}</td>`;
  return `<td>${value !== null && typeof value === 'object' ? render(value) : escapeHtml(textOf(value))}</td>`;
}

/** Numbers with at most 6 digits; exact integers in full; null as a dash. */
function textOf(value: Json): string {
  if (value === null) return '–';
  if (typeof value === 'boolean') return value ? 'yes' : 'no';
  if (typeof value !== 'number') return String(value);
  return Number.isInteger(value) ? String(value) : String(Number(value.toPrecision(6)));
}
