/** A drawing that answers to the pointer: its gates, lines of text and wires light up together. */
import { useSignalEffect } from '@preact/signals';
import { useLayoutEffect, useRef } from 'preact/hooks';
import type { Sheet } from './models.ts';

type Props = { sheet: Sheet; caption: string; empty: string };

export function DrawingView({ sheet, caption, empty }: Props) {
  const host = useRef<HTMLDivElement>(null);
  const drawing = sheet.shown.value;
  const hasMistakes = sheet.problems.value.length > 0;

  const light = (): void => {
    const line = sheet.line.peek();
    const wires = sheet.wires.peek();
    for (const group of host.current?.querySelectorAll('.op') ?? []) {
      const own = group.getAttribute('data-line');
      group.classList.toggle('hot', line > 0 && own === `${line}`);
    }
    for (const label of host.current?.querySelectorAll('.label') ?? []) {
      label.classList.toggle('hot', wires.includes(Number(label.getAttribute('data-wire') || -1)));
    }
  };
  useSignalEffect(() => {
    void sheet.line.value;
    void sheet.wires.value;
    light();
  });
  // a new drawing has nothing lit yet
  useLayoutEffect(light, [drawing?.svg]);

  const point = (event: PointerEvent): void => {
    const group = event.target instanceof Element ? event.target.closest('.op') : null;
    const line = Number(group?.getAttribute('data-line') ?? 0);
    if (line !== sheet.line.peek()) sheet.line.value = line;
    const wires = (group?.getAttribute('data-wires') ?? '').split(' ').filter(Boolean).map(Number);
    if (wires.join() !== sheet.wires.peek().join()) sheet.wires.value = wires;
  };

  return (
    <figure class={`drawing${hasMistakes ? ' old' : ''}`}>
      <figcaption>
        {caption}
        {hasMistakes && drawing ? ', before the mistake' : ''}
      </figcaption>
      {drawing ? (
        <section
          ref={host}
          class="scroll"
          tabIndex={0}
          aria-label={`${caption}, scrollable`}
          onPointerMove={point}
          onPointerLeave={() => {
            sheet.line.value = 0;
            sheet.wires.value = [];
          }}
          dangerouslySetInnerHTML={{ __html: drawing.svg }}
        />
      ) : (
        <p class="empty">{sheet.drawing.isRunning ? 'Reading …' : empty}</p>
      )}
    </figure>
  );
}
