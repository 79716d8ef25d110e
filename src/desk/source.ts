/** Tells what a text is, so that nobody has to say: a circuit, a matrix, or an expression. */
import type { Source } from '../commands.ts';

export function sourceOfText(text: string, name: string): Source {
  const isCircuit = /^\s*(\/\/|\/\*|@|#|OPENQASM\b|include\b|qubit\b|qreg\b|gate\b|const\b)/.test(
    text,
  );
  const isMatrix = /^\s*%%MatrixMarket/i.test(text);
  const isBlank = text.trim() === '';
  if (isCircuit || isMatrix || isBlank || /\b(qubit|qreg)\b/.test(text)) return { name, text };
  return { name: 'expression', text, isExpression: true };
}
