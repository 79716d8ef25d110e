/** Live convergence: the plot for the eyes, and the same in numbers for everybody. */
import { useSignalEffect } from '@preact/signals';
import { useEffect, useRef } from 'preact/hooks';
import type { ConvergenceData } from './convergence-data.ts';
import type { ConvergencePlot } from './convergence-plot.ts';
import { count, figure } from './words.ts';

export function Convergence({ data }: { data: ConvergenceData }) {
  const host = useRef<HTMLDivElement>(null);
  const plot = useRef<ConvergencePlot | null>(null);
  const isLoading = useRef(false);
  useSignalEffect(() => {
    void data.version.value;
    if (plot.current) return plot.current.update();
    if (data.curves.size === 0 || isLoading.current) return;
    isLoading.current = true;
    void import('./convergence-plot.ts').then(({ createPlot }) => {
      if (host.current) plot.current = createPlot(host.current, data);
    });
  });
  useEffect(() => () => plot.current?.destroy(), []);
  void data.version.value;
  const drawn = data.curves.size;
  const all = drawn + data.undrawn.size;
  return (
    <figure class="convergence" hidden={drawn === 0}>
      <figcaption>
        Distance D by iteration: {count(all, 'start')}
        {all > drawn ? `, the first ${drawn} drawn` : ''}, the best at D = {figure(data.best)}
      </figcaption>
      <div ref={host} class="plot" aria-hidden="true" />
    </figure>
  );
}
