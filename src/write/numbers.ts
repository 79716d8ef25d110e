/**
 * Writes angles as short text that reads back to the same double: a simple multiple of pi where that is
 * exact in floating point, else the shortest decimal form.
 */

/** Denominators tried; numerators go up to this many times the denominator. */
const DENOMINATORS = [1, 2, 3, 4, 5, 6, 8, 10, 12, 16, 32, 64, 128, 256, 512, 1024, 2048, 4096];
const TURNS_MAX = 8;

/** `language` 2.0 has no exponents without a decimal point and no spaces are used there. */
export function angleText(value: number, language: '2.0' | '3' = '3'): string {
  if (value === 0) return '0';
  for (const denominator of DENOMINATORS) {
    const numerator = Math.round((value * denominator) / Math.PI);
    if (numerator === 0 || Math.abs(numerator) > TURNS_MAX * denominator) continue;
    // the same operations in the same order as a reader of the text does them
    if ((numerator * Math.PI) / denominator !== value) continue;
    const size = Math.abs(numerator);
    const sign = numerator < 0 ? '-' : '';
    const top = size === 1 ? `${sign}pi` : `${sign}${size}*pi`;
    return denominator === 1 ? top : `${top}/${denominator}`;
  }
  return decimalText(value, language);
}

/** The shortest decimal text of a finite number. */
export function decimalText(value: number, language: '2.0' | '3' = '3'): string {
  const text = String(value);
  if (Number.isInteger(value) && !/e/.test(text)) {
    return Number.isSafeInteger(value) ? text : `${text}.0`;
  }
  if (language === '2.0' && /e/.test(text) && !/\./.test(text)) return text.replace('e', '.0e');
  return text;
}
