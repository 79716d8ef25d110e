/** The plot of all fits, loaded with the first fit: distance against iteration, one line for each start. */
import uPlot from 'uplot';
import 'uplot/dist/uPlot.min.css';
import type { ConvergenceData } from './convergence-data.ts';

/** Distances at or below rounding are drawn here: a logarithm has no zero. */
const DISTANCE_MIN = 1e-17;
const HEIGHT = 230;

export type ConvergencePlot = { update(): void; destroy(): void };

export function createPlot(host: HTMLElement, data: ConvergenceData): ConvergencePlot {
  let plot: uPlot | undefined;
  let seriesCount = 0;
  const colour = (name: string): string => getComputedStyle(host).getPropertyValue(name).trim();
  const width = (): number => Math.max(260, host.clientWidth);

  const build = (): void => {
    plot?.destroy();
    const ink = colour('--ink');
    const soft = colour('--soft');
    const rule = colour('--rule');
    const best = bestKey(data);
    const axis = { stroke: soft, grid: { stroke: rule, width: 1 }, ticks: { show: false } };
    const series: uPlot.Series[] = [...data.curves].map(([key, { label }]) => ({
      label,
      spanGaps: true,
      stroke: key === best ? colour('--accent') : ink,
      width: key === best ? 2.2 : 1,
      alpha: key === best ? 1 : 0.4,
      points: { show: false },
    }));
    plot = new uPlot(
      {
        width: width(),
        height: HEIGHT,
        legend: { show: false },
        cursor: { show: false },
        scales: { x: { time: false }, y: { distr: 3 } },
        axes: [
          { ...axis, label: 'iteration', labelSize: 20, labelFont: '12px sans-serif' },
          {
            ...axis,
            size: 62,
            values: (_plot, ticks) =>
              ticks.map((tick) => (tick === null ? '' : tick.toExponential(0))),
          },
        ],
        series: [{}, ...series],
      },
      aligned(data),
      host,
    );
    seriesCount = data.curves.size;
  };

  const update = (): void => {
    if (data.curves.size === 0) return;
    if (!plot || seriesCount !== data.curves.size) build();
    else plot.setData(aligned(data));
  };
  const observer = new ResizeObserver(() => plot?.setSize({ width: width(), height: HEIGHT }));
  observer.observe(host);
  const wish = matchMedia('(prefers-color-scheme: dark)');
  wish.addEventListener('change', build);
  update();
  return {
    update,
    destroy: () => {
      observer.disconnect();
      wish.removeEventListener('change', build);
      plot?.destroy();
    },
  };
}

function bestKey(data: ConvergenceData): string {
  let best = '';
  let least = Number.POSITIVE_INFINITY;
  for (const [key, { distances }] of data.curves) {
    const last = distances.at(-1) ?? Number.POSITIVE_INFINITY;
    if (last < least) [best, least] = [key, last];
  }
  return best;
}

/** All curves over one list of iterations, with gaps where a curve has no value. */
function aligned(data: ConvergenceData): uPlot.AlignedData {
  const curves = [...data.curves.values()];
  const xs = [...new Set(curves.flatMap(({ iterations }) => iterations))].sort((a, b) => a - b);
  const at = new Map(xs.map((x, k) => [x, k]));
  const rows = curves.map(({ iterations, distances }) => {
    const row: (number | null)[] = new Array(xs.length).fill(null);
    iterations.forEach((x, k) => {
      row[at.get(x)!] = Math.max(DISTANCE_MIN, distances[k]!);
    });
    return row;
  });
  return [xs, ...rows];
}
