/** Tabs as the ARIA practices describe them: arrow keys, Home and End move, and moving selects. */
import type { Signal } from '@preact/signals';
import type { JSX } from 'preact';
import { useRef } from 'preact/hooks';

export type Tab = { id: string; label: string; view: () => JSX.Element };

export function TabList({ tabs, current }: { tabs: readonly Tab[]; current: Signal<string> }) {
  const list = useRef<HTMLDivElement>(null);
  const move = (event: KeyboardEvent): void => {
    const at = tabs.findIndex(({ id }) => id === current.value);
    const to =
      event.key === 'ArrowRight'
        ? (at + 1) % tabs.length
        : event.key === 'ArrowLeft'
          ? (at + tabs.length - 1) % tabs.length
          : event.key === 'Home'
            ? 0
            : event.key === 'End'
              ? tabs.length - 1
              : -1;
    const next = tabs[to];
    if (!next) return;
    event.preventDefault();
    current.value = next.id;
    list.current?.querySelector<HTMLElement>(`#tab-${next.id}`)?.focus();
  };
  return (
    <div class="tabs" role="tablist" aria-label="What to do" ref={list} onKeyDown={move}>
      {tabs.map(({ id, label }) => (
        <button
          key={id}
          type="button"
          role="tab"
          id={`tab-${id}`}
          aria-controls={`panel-${id}`}
          aria-selected={current.value === id}
          tabIndex={current.value === id ? 0 : -1}
          onClick={() => {
            current.value = id;
          }}
        >
          {label}
        </button>
      ))}
    </div>
  );
}

/** A panel comes when it is first chosen and stays, so that each keeps its state; only the chosen one is shown. */
export function TabPanels({ tabs, current }: { tabs: readonly Tab[]; current: Signal<string> }) {
  const seen = useRef(new Set<string>());
  seen.current.add(current.value);
  return (
    <>
      {tabs.map(({ id, view: View }) => (
        <div
          key={id}
          role="tabpanel"
          id={`panel-${id}`}
          aria-labelledby={`tab-${id}`}
          hidden={current.value !== id}
        >
          {seen.current.has(id) && <View />}
        </div>
      ))}
    </>
  );
}
