/** The pictures of a survey or a narrowing: the circuit before, after, and the trade of wires against depth. */
import type { CommandRequest, CommandResult, Source } from '../commands.ts';
import { freeRunning } from '../control.ts';
import { type Drawing, drawSource, tradeOf } from '../draw.ts';
import { frontierPicture } from '../write/frontier-picture.ts';
import type { Captioned } from '../write/picture-sheet.ts';

export async function picturesOf(
  request: CommandRequest,
  { text, report }: CommandResult,
): Promise<Captioned[]> {
  if (request.command !== 'survey' && request.command !== 'narrow') return [];
  const { circuit: source, options } = request;
  const draw = (name: string, drawn: Source, qubitNames?: readonly string[]): Promise<Drawing> =>
    drawSource({
      kind: 'draw',
      id: name,
      seed: 1,
      source: drawn,
      options,
      picture: { idPrefix: name, ...(qubitNames ? { qubitNames } : {}) },
    });
  const before = await draw('before', source);
  const pictures = [{ caption: `Before: ${source.name}`, svg: before.svg }];
  if (text !== null) {
    // flags carry the names of the original
    const after = await draw('after', { name: 'narrowed', text }, before.wireNames);
    pictures.push({ caption: 'After', svg: after.svg });
  }
  const { points, written } = await tradeOf(
    { kind: 'trade', id: 'trade', seed: 1, source, options },
    freeRunning,
  );
  const narrowed = 'after' in report && report.after ? report.after : null;
  const marks = [
    { ...written, label: 'as written' },
    ...(narrowed
      ? [{ wires: narrowed.wires, depth: narrowed.depth, success: null, label: 'narrowed' }]
      : []),
  ];
  const trade = frontierPicture(points, marks, { idPrefix: 'trade' });
  return [...pictures, { caption: 'Wires against depth, by order alone', svg: trade }];
}
