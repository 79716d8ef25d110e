/**
 * Colours on terminals only. Continuous integration is no terminal: what is written there must be plain, as in a pipe.
 * NO_COLOR and FORCE_COLOR are heeded (common practice, no source).
 */
import pc from 'picocolors';

function wantsColours({ isTTY }: { isTTY?: boolean }): boolean {
  const { NO_COLOR, FORCE_COLOR, TERM } = process.env;
  if (NO_COLOR) return false;
  if (FORCE_COLOR !== undefined) return FORCE_COLOR !== '0' && FORCE_COLOR !== 'false';
  return isTTY === true && TERM !== 'dumb';
}

export const outputColours = pc.createColors(wantsColours(process.stdout));
export const errorColours = pc.createColors(wantsColours(process.stderr));
