/**
 * Writes a planar, row-major complex matrix in Matrix Market form (`array complex general`, NIST,
 * math.nist.gov/MatrixMarket/formats.html): entries column by column, with digits that read back to the same
 * doubles. Comments stand after the header, one line each.
 */
export function writeMatrixMarket(
  matrix: Float64Array,
  rows: number,
  columns: number,
  comments: readonly string[] = [],
): string {
  const lines = ['%%MatrixMarket matrix array complex general'];
  for (const comment of comments) {
    for (const part of comment.split('\n')) lines.push(`% ${part}`);
  }
  lines.push(`${rows} ${columns}`);
  const im = rows * columns;
  for (let j = 0; j < columns; j++) {
    for (let i = 0; i < rows; i++) {
      lines.push(`${text(matrix[i * columns + j]!)} ${text(matrix[im + i * columns + j]!)}`);
    }
  }
  return `${lines.join('\n')}\n`;
}

/** Shortest digits that give the same double; minus zero is written as zero. */
function text(x: number): string {
  return x === 0 ? '0' : String(x);
}
