/** The SVG document around every picture: size, title, description and, for a file, style and paper. */
import { escapeXml } from './picture-glyphs.ts';
import { STANDALONE_STYLE } from './picture-style.ts';

export type DocumentOptions = {
  /** With its own style and paper, for a file; without, for a page that has the style. Default true. */
  standalone?: boolean;
  /** Makes ids unique where several pictures share a page. Default `wg`. */
  idPrefix?: string;
};

/** `words.title` and `words.description` are for whoever cannot see the picture. */
export function svgDocument(
  width: number,
  height: number,
  words: { title: string; description: string },
  { standalone = true, idPrefix = 'wg' }: DocumentOptions,
  body: readonly string[],
): string {
  const [w, h] = [Math.ceil(width), Math.ceil(height)];
  return [
    `<svg xmlns="http://www.w3.org/2000/svg" class="wg" viewBox="0 0 ${w} ${h}" width="${w}" height="${h}" role="img" aria-labelledby="${idPrefix}-title ${idPrefix}-description">`,
    `<title id="${idPrefix}-title">${escapeXml(words.title)}</title>`,
    `<desc id="${idPrefix}-description">${escapeXml(words.description)}</desc>`,
    standalone
      ? `<style>${STANDALONE_STYLE}</style><rect class="paper" width="${w}" height="${h}"/>`
      : '',
    ...body,
    '</svg>',
  ].join('');
}
