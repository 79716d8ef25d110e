/** The kinds of jobs and the functions behind them: the same table in-process, in threads and in the browser. */
import { drawSource, tradeOf } from './draw.ts';
import { fitBlock } from './reshape/fit-block.ts';

export const jobTable = Object.freeze({ fit: fitBlock, draw: drawSource, trade: tradeOf });
