/**
 * Every example of the README is run and must give what the README shows; a last line `...` stands for the rest.
 * UPDATE_SNAPSHOTS=1 writes what the program says now into the README; read the difference before you keep it.
 */
import { spawnSync } from 'node:child_process';
import { existsSync, readFileSync, writeFileSync } from 'node:fs';
import { join, resolve } from 'node:path';
import { describe, expect, test } from 'vitest';

const root = resolve(import.meta.dirname, '..');
const readme = join(root, 'README.md');
const program = join(root, 'dist/cli.js');
const text = readFileSync(readme, 'utf8');
const blocks = [...text.matchAll(/```text\n\$ npx wiregauge ([^\n]*)\n([\s\S]*?)```/g)].map(
  ([whole, words, shown]) => ({ whole, words: words!, shown: shown! }),
);

function output(words: string): string {
  const list = [...words.matchAll(/"([^"]*)"|(\S+)/g)].map(([, quoted, bare]) => quoted ?? bare!);
  const { stdout } = spawnSync('node', [program, ...list, '--quiet'], {
    cwd: root,
    encoding: 'utf8',
    env: { ...process.env, NO_COLOR: '1' },
  });
  return stdout.trimEnd();
}

/** Rounding errors are shown as they came out; their digits are nobody's promise. */
function withoutRounding(shown: string): string {
  return shown.replace(/\d(\.\d+)?e-(1[5-9]|[2-9]\d)/g, 'rounding');
}

describe('the README', () => {
  test('has examples, and the program is built', () => {
    expect(blocks.length).toBeGreaterThanOrEqual(4);
    expect(existsSync(program)).toBe(true);
  });

  test.each(blocks)('$ npx wiregauge $words', ({ whole, words, shown }) => {
    const said = output(words);
    const lines = shown.trimEnd().split('\n');
    const isCut = lines.at(-1) === '...';
    const kept = isCut ? lines.slice(0, -1) : lines;
    const now = isCut ? said.split('\n').slice(0, kept.length).join('\n') : said;
    if (process.env.UPDATE_SNAPSHOTS) {
      const block = `\`\`\`text\n$ npx wiregauge ${words}\n${now}\n${isCut ? '...\n' : ''}\`\`\``;
      writeFileSync(
        readme,
        readFileSync(readme, 'utf8').replace(whole, () => block),
      );
      return;
    }
    expect(withoutRounding(now)).toBe(withoutRounding(kept.join('\n')));
  });

  test('the two commands of the set-up stand there word for word', () => {
    expect(text).toContain('npm ci && npx wiregauge narrow src/examples/opening.qasm');
    expect(text).toContain('npm ci && npm test');
  });
});
