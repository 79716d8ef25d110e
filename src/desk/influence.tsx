/**
 * The influence table: rows are outputs, columns inputs. A cell is free (no path of gates), an opening (a
 * path, but nothing passes), or tied, with the least error of breaking the tie. Shape and text tell the
 * three apart; the shade only repeats it. A grid for the keyboard: arrows move, Enter chooses.
 */
import { useSignal } from '@preact/signals';
import { useRef } from 'preact/hooks';
import type { Pair, SurveyReport } from '../reports.ts';
import type { NarrowModel } from './models.ts';
import { hasComplaint } from './settings.ts';
import { cellKind, cellSentence, figure } from './words.ts';

/** Larger tables are left to the saved report. */
const TABLE_WIRES_MAX = 40;
/** Up to this many wires the bounds stand in the cells. */
const NUMBERS_WIRES_MAX = 10;

export function InfluenceTable({ model, report }: { model: NarrowModel; report: SurveyReport }) {
  const names = model.sheet.shown.value?.wireNames ?? [];
  const n = report.structure.reach.length;
  const focus = useSignal<Pair>({ leaves: 0, enters: 0 });
  const grid = useRef<HTMLTableElement>(null);
  if (n === 0 || n > TABLE_WIRES_MAX) {
    return (
      <p class="empty">
        The table would have {report.counts.wires} × {report.counts.wires} cells; it is shown for up
        to {TABLE_WIRES_MAX} wires. The saved report has it in full.
      </p>
    );
  }
  const look = (pair: Pair | null): void => {
    model.cell.value = pair;
    model.sheet.wires.value = pair ? [pair.leaves, pair.enters] : [];
  };
  const choose = (pair: Pair): void => {
    look(pair);
    if (cellKind(report, pair.leaves, pair.enters) !== 'opening' || hasComplaint()) return;
    void model.narrow(pair);
  };
  const move = (event: KeyboardEvent): void => {
    const step: Readonly<Record<string, readonly [number, number]>> = {
      ArrowUp: [-1, 0],
      ArrowDown: [1, 0],
      ArrowLeft: [0, -1],
      ArrowRight: [0, 1],
      Home: [0, -n],
      End: [0, n],
    };
    const by = step[event.key];
    if (event.key === 'Enter' || event.key === ' ') {
      event.preventDefault();
      return choose(focus.value);
    }
    if (!by) return;
    event.preventDefault();
    const clamp = (x: number): number => Math.min(n - 1, Math.max(0, x));
    const next = { leaves: clamp(focus.value.leaves + by[0]), enters: clamp(focus.value.enters + by[1]) }; // biome-ignore format: one pair
    focus.value = next;
    look(next);
    grid.current
      ?.querySelector<HTMLElement>(`[data-cell="${next.leaves},${next.enters}"]`)
      ?.focus();
  };
  const withNumbers = n <= NUMBERS_WIRES_MAX;
  return (
    <div class="influence">
      {/* a region of its own, so that a keyboard can scroll it */}
      <div class="scroll" tabIndex={0} role="region" aria-label="Influence table">
        <table
          role="grid"
          ref={grid}
          class={withNumbers ? 'roomy' : 'tight'}
          onKeyDown={move}
          onPointerLeave={() => {
            model.sheet.wires.value = [];
          }}
        >
          <caption>Rows: outputs that leave. Columns: inputs that enter.</caption>
          <thead>
            <tr>
              <td />
              {names.slice(0, n).map((name) => (
                <th key={name} scope="col">
                  <span>{name}</span>
                </th>
              ))}
            </tr>
          </thead>
          <tbody>
            {names.slice(0, n).map((out, leaves) => (
              <tr key={out}>
                <th scope="row">{out}</th>
                {names.slice(0, n).map((into, enters) => {
                  const pair = { leaves, enters };
                  const kind = cellKind(report, leaves, enters);
                  const bound = report.influence?.table[leaves]?.[enters];
                  const isFocus = focus.value.leaves === leaves && focus.value.enters === enters;
                  const isChosen = model.cell.value?.leaves === leaves && model.cell.value.enters === enters; // biome-ignore format: one test
                  return (
                    <td
                      key={into}
                      role="gridcell"
                      data-cell={`${leaves},${enters}`}
                      class={`${kind} shade-${shade(bound)}`}
                      tabIndex={isFocus ? 0 : -1}
                      aria-selected={isChosen}
                      onFocus={() => {
                        focus.value = pair;
                        look(pair);
                      }}
                      onClick={() => choose(pair)}
                      onPointerEnter={() => look(pair)}
                    >
                      <span class="only-read">{`${out} leaves, ${into} enters: ${cellWord(kind, bound)}`}</span>
                      {withNumbers ? (
                        cellText(kind, bound)
                      ) : (
                        <span class="mark" aria-hidden="true" />
                      )}
                    </td>
                  );
                })}
              </tr>
            ))}
          </tbody>
        </table>
      </div>
      <div class="reading">
        <ul class="key">
          <li>
            <span class="swatch free">·</span> free: no path of gates
          </li>
          <li>
            <span class="swatch opening">○</span> opening: a path, but nothing passes
          </li>
          <li>
            <span class="swatch tied">.07</span> tied: the least error of breaking it
          </li>
        </ul>
        <p class="cell-sentence" role="status">
          {model.cell.value
            ? cellSentence(report, model.cell.value, names)
            : report.openings.length > 0
              ? 'Choose an opening to narrow through it.'
              : 'There is no opening in this table.'}
        </p>
      </div>
    </div>
  );
}

function cellWord(kind: 'free' | 'opening' | 'tied', bound: number | undefined): string {
  if (kind !== 'tied') return kind;
  return bound === undefined ? 'tied' : `tied, at least ${figure(bound)}`;
}

function cellText(kind: 'free' | 'opening' | 'tied', bound: number | undefined) {
  if (kind === 'free') return <span aria-hidden="true">·</span>;
  if (kind === 'opening') return <span aria-hidden="true">○</span>;
  if (bound === undefined) return <span aria-hidden="true">–</span>;
  const text = bound >= 0.01 ? bound.toFixed(2).replace(/^0/, '') : figure(bound);
  return <span aria-hidden="true">{text}</span>;
}

/** A step of shade from 0 to 4: influence is at most 1, and small ones should still be seen. */
function shade(bound: number | undefined): number {
  if (bound === undefined) return 1;
  return Math.max(0, Math.min(4, Math.ceil(4 * Math.sqrt(bound))));
}
