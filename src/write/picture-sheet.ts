/** Puts several pictures under each other on one sheet, each under its caption. */
import { escapeXml } from './picture-glyphs.ts';

export type Captioned = { caption: string; svg: string };

const MARGIN = 24;
const CAPTION = 30;

/** One SVG document; the pictures keep their own size, style and description. */
export function pictureSheet(pictures: readonly Captioned[], title: string): string {
  let y = MARGIN;
  let width = 0;
  const parts: string[] = [];
  for (const { caption, svg } of pictures) {
    const size = /<svg[^>]*?\swidth="([\d.]+)"\sheight="([\d.]+)"/.exec(svg);
    const [w, h] = [Number(size?.[1] ?? 0), Number(size?.[2] ?? 0)];
    parts.push(
      `<text x="${MARGIN}" y="${y + 16}" font-family="Georgia, serif" font-size="15" fill="currentColor">${escapeXml(caption)}</text>`,
      svg.replace('<svg', `<svg x="${MARGIN}" y="${y + CAPTION}"`),
    );
    y += CAPTION + h + MARGIN;
    width = Math.max(width, w);
  }
  const [all, tall] = [width + 2 * MARGIN, y];
  return `<svg xmlns="http://www.w3.org/2000/svg" viewBox="0 0 ${all} ${tall}" width="${all}" height="${tall}" role="img"><title>${escapeXml(title)}</title>${parts.join('')}</svg>\n`;
}
