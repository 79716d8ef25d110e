import { expect, test } from 'vitest';
import { reportHtml } from '../../src/write/report-html.ts';

const page = reportHtml(
  {
    verdict: 'narrowed',
    reason: 'gauge <3> & "7"',
    before: { wires: 4, twoQubitDepth: 9 },
    influence: { table: [[0, 0.0714285714], [1, 0]] }, // biome-ignore format: a table
    reuse: [{ wire: 0, leaves: 0, enters: 3 }],
    notes: [],
    check: null,
  },
  {
    title: 'Narrow <valley.qasm>',
    summary: '4 wires become 3.',
    pictures: [{ caption: 'before', svg: '<svg role="img"></svg>' }],
  },
);

test('nothing of the report can become markup, and nothing is loaded or run', () => {
  expect(page).toContain('gauge &lt;3&gt; &amp; &quot;7&quot;');
  expect(page).toContain('<title>Narrow &lt;valley.qasm&gt;</title>');
  expect(page).not.toMatch(/<script|<link|src=|href=|@import|url\(/);
});

test('lists of objects are tables with headings, tables of numbers are grids, empty lists say none', () => {
  expect(page).toContain('<th scope="col">leaves</th><th scope="col">enters</th>');
  expect(page).toContain('<td class="number">0.0714286</td>');
  expect(page).toContain('<h2>notes</h2><p>none</p>');
  expect(page).toContain('<th scope="row">two qubit depth</th><td class="number">9</td>');
  expect(page).toContain('<th scope="row">check</th><td>–</td>');
});
