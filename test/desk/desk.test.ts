/**
 * The page in a real browser: each job from start to saved file, mistakes, stopping, keyboard, accessibility, both sizes.
 * Screenshots go to test-artefacts/ for a person to look at. Without a browser the tests say so and are skipped; in CI that is
 * a failure.
 */
import { existsSync, mkdirSync, readFileSync } from 'node:fs';
import { createRequire } from 'node:module';
import { join, resolve } from 'node:path';
import { type Browser, chromium, type Page } from 'playwright-core';
import { afterAll, beforeAll, describe, expect, test } from 'vitest';
import { CONTENT_POLICY, type Desk, startDesk } from '../../src/cli/desk-server.ts';

const root = resolve(import.meta.dirname, '../..');
const artefacts = join(root, 'test-artefacts');
const browserPath = '/usr/bin/chromium';
const isHere = existsSync(browserPath);
if (!isHere && !process.env.CI)
  console.warn('SKIPPED (no browser at /usr/bin/chromium): the desk in a browser');
const axeSource = readFileSync(
  createRequire(import.meta.url).resolve('axe-core/axe.min.js'),
  'utf8',
);
const WAIT = { timeout: 30_000 };

let desk: Desk;
let browser: Browser;
const foreign: string[] = [];
const faults: string[] = [];
let isMeasuring = false;

async function open(
  options: { width?: number; dark?: boolean; hash?: string } = {},
): Promise<Page> {
  const { width = 1280, dark = false, hash = '' } = options;
  const context = await browser.newContext({
    viewport: { width, height: 900 },
    colorScheme: dark ? 'dark' : 'light',
    reducedMotion: 'reduce',
    acceptDownloads: true,
    permissions: ['clipboard-read', 'clipboard-write'],
  });
  const page = await context.newPage();
  page.setDefaultTimeout(WAIT.timeout);
  page.on('request', (request) => {
    if (!/^(data|blob):/.test(request.url()) && !request.url().startsWith(desk.url))
      foreign.push(request.url());
  });
  page.on('pageerror', (error) => faults.push(error.message));
  page.on('console', (message) => {
    if (message.type() === 'error' && !isMeasuring) faults.push(message.text());
  });
  await page.goto(desk.url + hash);
  return page;
}

async function surveyed(page: Page): Promise<void> {
  await page.getByText('Fewest wires, by what must stay the same').waitFor(WAIT);
}

async function shot(page: Page, name: string): Promise<void> {
  await page.screenshot({ path: join(artefacts, `${name}.png`), fullPage: true });
}

/** Every rule of axe-core, on the page as it is now. */
async function accessible(page: Page): Promise<void> {
  // axe probes colours by a style of its own, which the page's policy refuses: not a fault of the page
  isMeasuring = true;
  await page.evaluate(axeSource);
  const found = await page.evaluate(async () => {
    const { axe } = globalThis as unknown as {
      axe: { run(): Promise<{ violations: { id: string; nodes: { html: string }[] }[] }> };
    };
    const { violations } = await axe.run();
    return violations.map(({ id, nodes }) => `${id}: ${nodes.map(({ html }) => html).join(' ')}`);
  });
  isMeasuring = false;
  expect(found).toEqual([]);
}

async function saved(page: Page, button: string): Promise<string> {
  const [download] = await Promise.all([
    page.waitForEvent('download'),
    page.getByRole('button', { name: button, exact: true }).click(),
  ]);
  return readFileSync(await download.path(), 'utf8');
}

/** Pastes a text into an editor in place of what is there. */
async function write(page: Page, label: string, text: string): Promise<void> {
  const editor = page.getByRole('textbox', { name: label });
  await editor.click();
  await page.keyboard.press('Control+A');
  await page.evaluate((copied) => navigator.clipboard.writeText(copied), text);
  await page.keyboard.press('Control+V');
}

describe.runIf(isHere || process.env.CI)('the desk', () => {
  beforeAll(async () => {
    mkdirSync(artefacts, { recursive: true });
    desk = await startDesk({ directory: join(root, 'dist/desk') });
    browser = await chromium.launch({
      executablePath: browserPath,
      args: [
        '--no-sandbox',
        '--disable-gpu',
        '--disable-quic',
        '--no-first-run',
        '--disable-background-networking',
        '--disable-component-update',
        '--disable-sync',
      ],
    });
  });
  afterAll(async () => {
    await browser?.close();
    await desk?.close();
  });

  test('the example is surveyed, and every state so far is accessible', async () => {
    const page = await open();
    await surveyed(page);
    expect(await page.locator('body').textContent()).toContain('It is written on 4 wires.');
    expect(await page.locator('[role=gridcell].opening').count()).toBe(1);
    await accessible(page);
    await shot(page, 'narrow-surveyed');
    await page.context().close();
  });

  test('narrow: from the button to saved files', async () => {
    const page = await open();
    await surveyed(page);
    await page.getByRole('button', { name: 'Narrow it' }).click();
    await page.getByText('Narrowed: 4 wires became 3.').waitFor(WAIT);
    await accessible(page);
    await shot(page, 'narrow-done');
    const text = await saved(page, 'narrowed.qasm');
    expect(text).toMatch(/^OPENQASM 3/);
    expect(text).toContain('@wiregauge.enters 3');
    expect(JSON.parse(await saved(page, 'narrow.json'))).toMatchObject({
      schema: 'wiregauge/narrow@1',
      verdict: 'narrowed',
      check: { proof: true },
    });
    expect(await saved(page, 'narrowed.svg')).toMatch(/<svg/);
    await page.context().close();
  });

  test('an opening is chosen by keyboard alone, and starts a narrowing', async () => {
    const page = await open();
    await surveyed(page);
    const cell = page.locator('[data-cell="0,0"]');
    await cell.focus();
    for (const _ of [1, 2, 3]) await page.keyboard.press('ArrowRight');
    await page.keyboard.press('Enter');
    await page.getByText('Narrowed: 4 wires became 3.').waitFor(WAIT);
    // and the pages are reached by arrow keys
    await page.getByRole('tab', { name: 'Narrow' }).focus();
    await page.keyboard.press('ArrowRight');
    expect(await page.getByRole('tab', { name: 'Compare' }).getAttribute('aria-selected')).toBe(
      'true',
    );
    await page.context().close();
  });

  test('the whole job by keyboard alone: from the first Tab to the saved file', async () => {
    const page = await open();
    await surveyed(page);
    await page.locator('.cm-content').first().waitFor(WAIT);
    /** Tabs on until the control of this name has the focus. */
    const tabTo = async (name: RegExp): Promise<void> => {
      for (let k = 0; k < 60; k++) {
        await page.keyboard.press('Tab');
        const found = await page.evaluate(() => document.activeElement?.textContent ?? '');
        if (name.test(found.trim())) return;
      }
      throw new Error(`no way by Tab to ${name}`);
    };
    await tabTo(/^Narrow it$/);
    await page.keyboard.press('Enter');
    await page.getByText('Narrowed: 4 wires became 3.').waitFor(WAIT);
    await tabTo(/^narrowed\.qasm$/);
    const [download] = await Promise.all([
      page.waitForEvent('download'),
      page.keyboard.press('Enter'),
    ]);
    expect(readFileSync(await download.path(), 'utf8')).toContain('@wiregauge.enters 3');
    await page.context().close();
  });

  test('a gate under the pointer lights up its line of text, and its cells', async () => {
    const page = await open();
    await surveyed(page);
    await page.locator('.cm-content').first().waitFor(WAIT);
    const gate = page.locator('svg [data-line="8"]').first();
    await gate.hover();
    await page.locator('.cm-line[class*=linked]', { hasText: 'rx(0.7) station[0]' }).waitFor(WAIT);
    await shot(page, 'hover');
    await page.context().close();
  });

  test('sixty wires and two thousand gates are drawn and surveyed', async () => {
    const page = await open();
    await surveyed(page);
    const lines = ['OPENQASM 3;', 'include "stdgates.inc";', 'qubit[60] river;'];
    for (let k = 0; k < 1000; k++) {
      const a = (7 * k) % 60;
      lines.push(`ry(0.3) river[${a}];`, `cx river[${a}], river[${(a + 1 + (k % 9)) % 60}];`);
    }
    await write(page, 'Circuit as text', lines.join('\n'));
    await page.getByText('It is written on 60 wires').waitFor(WAIT);
    expect(await page.locator('svg [data-line]').count()).toBeGreaterThan(1900);
    await accessible(page);
    await page.context().close();
  });

  test('the impossible case says why, with the bound', async () => {
    const page = await open();
    await page.getByRole('combobox', { name: 'Example' }).selectOption({ label: 'no opening' });
    await page.getByText('It is written on 3 wires').waitFor(WAIT);
    // the editor shows the example that was chosen
    await page.locator('.cm-line', { hasText: 'in a ring' }).waitFor(WAIT);
    await page.getByRole('button', { name: 'Narrow it' }).click();
    await page
      .getByText(/No equal circuit has fewer than 3 wires: none lets .* at least 0\.\d+/i)
      .first()
      .waitFor(WAIT);
    await accessible(page);
    await shot(page, 'narrow-impossible');
    await page.context().close();
  });

  test('mistakes are marked where they are, and nothing is left of the old answer', async () => {
    const page = await open();
    await surveyed(page);
    await write(
      page,
      'Circuit as text',
      'OPENQASM 3;\ninclude "stdgates.inc";\nqubit[2] q;\nhh q[0];\nh q[5];\n',
    );
    await page.getByText('2 mistakes in this text:').waitFor(WAIT);
    const list = await page.locator('.problems li').allInnerTexts();
    expect(list[0]).toMatch(/4/);
    expect(list[0]).toMatch(/unknown gate: hh/i);
    expect(list[1]).toMatch(/5/);
    // and marked in the text itself
    expect(await page.locator('.cm-lintRange-error').count()).toBe(2);
    await accessible(page);
    await shot(page, 'mistakes');
    await page.getByText('Fewest wires, by what must stay the same').waitFor({ state: 'detached' });
    await page.context().close();
  });

  test('compare: the same, and different with a witness', async () => {
    const page = await open();
    await page.getByRole('tab', { name: 'Compare' }).click();
    await page.getByRole('button', { name: 'Compare them' }).click();
    await page.locator('#panel-compare .lead').getByText(/same/i).waitFor(WAIT);
    await accessible(page);
    await shot(page, 'compare-same');
    await page.getByRole('button', { name: 'The same, one angle off' }).click();
    await page.getByRole('button', { name: /Compare them|again/ }).click();
    await page
      .locator('#panel-compare .lead')
      .getByText(/different|differ/i)
      .waitFor(WAIT);
    expect(await page.locator('#panel-compare').textContent()).toMatch(/station\[\d\]/);
    await accessible(page);
    await shot(page, 'compare-different');
    await page.context().close();
  });

  test('build: native gates for a target, saved', async () => {
    const page = await open();
    await page.getByRole('tab', { name: 'Build' }).click();
    await write(page, 'Target as text', 'swap');
    await page.getByRole('button', { name: /Build/ }).last().click();
    await page.locator('#panel-build .lead').waitFor(WAIT);
    expect(await page.locator('#panel-build').textContent()).toMatch(/3/);
    await accessible(page);
    await shot(page, 'build-done');
    expect(await saved(page, 'built.qasm')).toMatch(/^OPENQASM 3/);
    await page.context().close();
  });

  test('a running fit is stopped at once, and can be started again', async () => {
    const page = await open();
    await page.getByRole('tab', { name: 'Build' }).click();
    await write(
      page,
      'Target as text',
      readFileSync(join(root, 'reference-unitaries/haar-4.mtx'), 'utf8'),
    );
    const start = page.getByRole('button', { name: /^(Build|Make)/ }).last();
    await start.click();
    const stop = page.getByRole('button', { name: 'Stop' });
    await stop.waitFor(WAIT);
    await shot(page, 'build-running');
    await stop.click();
    await stop.waitFor({ state: 'detached', timeout: 3000 });
    await page.getByRole('button', { name: /again/i }).waitFor(WAIT);
    await page.context().close();
  });

  test('typing stays quick while fits run', async () => {
    const page = await open();
    await surveyed(page);
    await page.locator('.cm-content').first().waitFor(WAIT);
    await page.getByRole('button', { name: 'Narrow it' }).click();
    const editor = page.getByRole('textbox', { name: 'Circuit as text' });
    await editor.click();
    await page.keyboard.press('Control+End');
    await page.keyboard.type('// a note');
    await page.locator('.cm-line', { hasText: '// a note' }).waitFor(WAIT);
    // the edit makes the running answer stale: it must not appear any more
    await surveyed(page);
    await page.context().close();
  });

  test('a link brings back circuit and page', async () => {
    const page = await open();
    await surveyed(page);
    await write(
      page,
      'Circuit as text',
      'OPENQASM 3;\nqubit[2] brook;\nU(0.1, 0.2, 0.3) brook[0];\n',
    );
    await page.getByText('brook[1]').first().waitFor(WAIT);
    await page.getByRole('button', { name: 'Copy a link to this' }).click();
    await page.waitForFunction(() => location.hash.length > 10);
    const hash = await page.evaluate(() => location.hash);
    const other = await open({ hash });
    await other.getByText('brook[1]').first().waitFor(WAIT);
    await page.context().close();
    await other.context().close();
  });

  test.each([
    [390, false],
    [390, true],
    [1280, true],
  ])('%i px, dark %s: nothing sticks out, axe is content', async (width, dark) => {
    const page = await open({ width, dark });
    await surveyed(page);
    expect(await page.evaluate(() => document.documentElement.scrollWidth)).toBeLessThanOrEqual(
      width,
    );
    await accessible(page);
    await shot(page, `surveyed-${width}-${dark ? 'dark' : 'light'}`);
    await page.context().close();
  });

  test('nothing was asked of other hosts, and no fault was reported', () => {
    expect(foreign).toEqual([]);
    expect(faults).toEqual([]);
  });

  test('the server answers for the page alone, on loopback, with its policy', async () => {
    expect(new URL(desk.url).hostname).toBe('127.0.0.1');
    const page = await fetch(desk.url);
    expect(page.headers.get('content-security-policy')).toBe(CONTENT_POLICY);
    expect(CONTENT_POLICY).not.toMatch(/'unsafe-inline'|'unsafe-eval'|\*/);
    for (const path of [
      '/../package.json',
      '/%2e%2e/package.json',
      '/assets/../../cli.js',
      '/nowhere',
    ]) {
      expect((await fetch(new URL(path, desk.url))).status).toBe(404);
    }
    expect((await fetch(desk.url, { method: 'POST' })).status).toBe(405);
  });
});
