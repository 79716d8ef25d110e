/** The page: three jobs side by side, a link that reproduces them, and the style of all pictures. */
import { effect, signal } from '@preact/signals';
import { render } from 'preact';
import { PICTURE_STYLE } from '../write/picture-style.ts';
import { BuildPage } from './build-page.tsx';
import { ComparePage } from './compare-page.tsx';
import { EXAMPLE_TARGETS, exampleText, FIRST_EXAMPLE } from './example-texts.ts';
import { fromFragment, toFragment } from './link.ts';
import { BuildModel, CompareModel, NarrowModel } from './models.ts';
import { NarrowPage } from './narrow-page.tsx';
import { DEFAULT_SETTINGS, type Settings, settings } from './settings.ts';
import { type Tab, TabList, TabPanels } from './tabs.tsx';

const LINK_MS = 500;
/** Browsers differ beyond this; longer states are not put into the address. */
const LINK_LENGTH_MAX = 60_000;

const narrowing = new NarrowModel();
const comparing = new CompareModel();
const building = new BuildModel();
const page = signal('narrow');
const linkNote = signal('');

const tabs: readonly Tab[] = [
  { id: 'narrow', label: 'Narrow', view: () => <NarrowPage model={narrowing} /> },
  { id: 'compare', label: 'Compare', view: () => <ComparePage model={comparing} /> },
  { id: 'build', label: 'Build', view: () => <BuildPage model={building} /> },
];

const texts = {
  circuit: narrowing.sheet.text,
  original: comparing.original.text,
  rewritten: comparing.rewritten.text,
  target: building.target.text,
};

function Desk() {
  return (
    <>
      <header>
        <h1>Wiregauge</h1>
        <p>How many wires a quantum circuit really needs, and the same circuit on fewer.</p>
        <TabList tabs={tabs} current={page} />
      </header>
      <main>
        <TabPanels tabs={tabs} current={page} />
      </main>
      <footer>
        <p>
          <button type="button" class="plain" onClick={() => void copyLink()}>
            Copy a link to this
          </button>{' '}
          <span role="status">{linkNote.value}</span>
        </p>
        <p>
          Everything is computed in this browser; no circuit leaves the machine. A link holds the
          circuit and the options after its #, which browsers send nowhere.
        </p>
      </footer>
    </>
  );
}

async function copyLink(): Promise<void> {
  await writeLink();
  try {
    await navigator.clipboard.writeText(location.href);
    linkNote.value = 'Copied.';
  } catch {
    // no permission: the address bar has it all the same
    linkNote.value = 'The address of this page is the link.';
  }
}

/** Only what differs from the defaults, so that links stay short. */
function changedSettings(): Record<string, string> {
  const entries = Object.entries(settings.peek());
  return Object.fromEntries(
    entries.filter(([name, value]) => DEFAULT_SETTINGS[name as keyof Settings] !== value),
  );
}

async function writeLink(): Promise<void> {
  const now = Object.fromEntries(Object.entries(texts).map(([name, text]) => [name, text.peek()]));
  const fragment = await toFragment({ page: page.peek(), texts: now, settings: changedSettings() });
  if (fragment.length > LINK_LENGTH_MAX) {
    linkNote.value = 'The circuits are too long for a link.';
    return;
  }
  ownHash = `#${fragment}`;
  history.replaceState(null, '', ownHash);
}

let ownHash = '';

async function readLink(): Promise<void> {
  const linked = await fromFragment(location.hash.slice(1));
  if (location.hash.length > 1 && !linked) {
    linkNote.value = 'The link could not be read, so this is the first example.';
  }
  if (linked) {
    const known = Object.entries(linked.settings).filter(([name]) => name in DEFAULT_SETTINGS);
    settings.value = { ...DEFAULT_SETTINGS, ...Object.fromEntries(known) };
    if (tabs.some(({ id }) => id === linked.page)) page.value = linked.page;
  }
  const start: Record<keyof typeof texts, string> = {
    circuit: exampleText(FIRST_EXAMPLE),
    original: exampleText('relay.qasm'),
    rewritten: exampleText('relay-rewritten.qasm'),
    target: EXAMPLE_TARGETS[0]?.text ?? '',
  };
  for (const name of Object.keys(texts) as (keyof typeof texts)[]) {
    texts[name].value = linked?.texts[name] ?? start[name];
  }
}

function keepLink(): void {
  let timer: ReturnType<typeof setTimeout> | undefined;
  let isFirst = true;
  effect(() => {
    void [page.value, settings.value, ...Object.values(texts).map((text) => text.value)];
    if (!isFirst) {
      clearTimeout(timer);
      timer = setTimeout(() => void writeLink(), LINK_MS);
    }
    isFirst = false;
  });
}

async function start(): Promise<void> {
  const sheet = new CSSStyleSheet();
  sheet.replaceSync(PICTURE_STYLE);
  document.adoptedStyleSheets.push(sheet);
  await readLink();
  const root = document.getElementById('desk');
  if (root) render(<Desk />, root);
  effect(() => {
    if (page.value === 'compare') comparing.isAwake.value = true;
    if (page.value === 'build') building.isAwake.value = true;
  });
  keepLink();
  addEventListener('hashchange', () => {
    if (location.hash !== ownHash) void readLink();
  });
}

void start();
