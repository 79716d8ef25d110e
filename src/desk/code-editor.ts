/**
 * The editor proper, loaded when the page is already there. It lives in a shadow root, where its own style
 * sheets are adopted ones, which the content policy allows.
 */
import { defaultKeymap, history, historyKeymap } from '@codemirror/commands';
import { type Diagnostic, lintGutter, lintKeymap, setDiagnostics } from '@codemirror/lint';
import { EditorState, StateEffect, StateField } from '@codemirror/state';
import {
  Decoration,
  type DecorationSet,
  drawSelection,
  EditorView,
  highlightActiveLine,
  keymap,
  lineNumbers,
  MatchDecorator,
  ViewPlugin,
  type ViewUpdate,
} from '@codemirror/view';
import type { InputProblem } from '../input-error.ts';

export type CodeEditor = {
  setText(text: string): void;
  setProblems(problems: readonly InputProblem[]): void;
  /** Marks a line that something else points at; 0 for none. */
  setLinkedLine(line: number): void;
  /** Puts the cursor to a place (1-based) and looks at it. */
  goTo(line: number, column: number): void;
  focus(): void;
};

export type EditorEvents = {
  label: string;
  onText: (text: string) => void;
  onLine: (line: number) => void;
};

const token =
  /(\/\/.*)|(^\s*@.*)|("[^"]*")|\b(OPENQASM|include|qubit|qreg|bit|creg|gate|measure|reset|barrier|if|else|for|in|const|int|uint|float|let|ctrl|negctrl|inv|pow|gphase|pi|tau|euler)\b|\b(\d[\d_.]*(?:e[+-]?\d+)?)\b/gm;
const tokenClasses = ['comment', 'note', 'string', 'word', 'number'];

const decorator = new MatchDecorator({
  regexp: token,
  decoration: (match) => {
    const at = tokenClasses.findIndex((_, k) => match[k + 1] !== undefined);
    return Decoration.mark({ class: `t-${tokenClasses[at] ?? 'word'}` });
  },
});

const colours = ViewPlugin.fromClass(
  class {
    decorations: DecorationSet;
    constructor(view: EditorView) {
      this.decorations = decorator.createDeco(view);
    }
    update(update: ViewUpdate): void {
      this.decorations = decorator.updateDeco(update, this.decorations);
    }
  },
  { decorations: (plugin) => plugin.decorations },
);

const linkLine = StateEffect.define<number>();
const linkedMark = Decoration.line({ class: 'linked' });
const linkedLine = StateField.define<DecorationSet>({
  create: () => Decoration.none,
  update: (before, transaction) => {
    let marks = before.map(transaction.changes);
    for (const effect of transaction.effects) {
      if (!effect.is(linkLine)) continue;
      const { doc } = transaction.state;
      marks =
        effect.value >= 1 && effect.value <= doc.lines
          ? Decoration.set([linkedMark.range(doc.line(effect.value).from)])
          : Decoration.none;
    }
    return marks;
  },
  provide: (field) => EditorView.decorations.from(field),
});

const theme = EditorView.theme({
  '&': { color: 'var(--ink)', backgroundColor: 'transparent', fontSize: '0.8125rem' },
  '&.cm-focused': { outline: '2px solid var(--accent)', outlineOffset: '1px' },
  '.cm-scroller': { fontFamily: 'var(--code)', lineHeight: '1.6', maxHeight: '26rem' },
  '.cm-gutters': { backgroundColor: 'transparent', color: 'var(--soft)', border: 'none' },
  '.cm-activeLine': { backgroundColor: 'var(--faint)' },
  '.linked': { backgroundColor: 'var(--tint)' },
  '.cm-cursor': { borderLeftColor: 'var(--ink)' },
  '&.cm-focused > .cm-scroller > .cm-selectionLayer .cm-selectionBackground, .cm-selectionBackground':
    { backgroundColor: 'var(--tint)' },
  '.t-comment': { color: 'var(--soft)', fontStyle: 'italic' },
  '.t-note': { color: 'var(--accent)' },
  '.t-word': { fontWeight: '600' },
  '.t-number': { color: 'var(--accent)' },
  '.cm-tooltip': {
    backgroundColor: 'var(--paper)',
    color: 'var(--ink)',
    borderColor: 'var(--rule)',
  },
  '.cm-diagnostic': { fontFamily: 'var(--label)' },
  '.cm-diagnostic-error': { borderLeftColor: 'var(--wrong)' },
});

export function createEditor(host: HTMLElement, text: string, events: EditorEvents): CodeEditor {
  const root = host.shadowRoot ?? host.attachShadow({ mode: 'open' });
  let isOurs = false;
  const view: EditorView = new EditorView({
    root,
    parent: root,
    state: EditorState.create({
      doc: text,
      extensions: [
        lineNumbers(),
        history(),
        drawSelection(),
        highlightActiveLine(),
        colours,
        linkedLine,
        lintGutter(),
        keymap.of([...defaultKeymap, ...historyKeymap, ...lintKeymap]),
        EditorView.lineWrapping,
        EditorView.contentAttributes.of({ 'aria-label': events.label, spellcheck: 'false' }),
        theme,
        EditorView.updateListener.of((update) => {
          if (update.docChanged && !isOurs) events.onText(update.state.doc.toString());
          if (update.selectionSet && view.hasFocus) {
            events.onLine(update.state.doc.lineAt(update.state.selection.main.head).number);
          }
        }),
      ],
    }),
  }); // the scroller is reached by keyboard of its own, for texts that are only read
  view.scrollDOM.tabIndex = 0;

  const placeOf = (line: number, column: number): number => {
    const { doc } = view.state;
    const found = doc.line(Math.min(Math.max(line, 1), doc.lines));
    return Math.min(found.from + Math.max(column - 1, 0), found.to);
  };
  return {
    setText: (next) => {
      if (next === view.state.doc.toString()) return;
      isOurs = true;
      view.dispatch({ changes: { from: 0, to: view.state.doc.length, insert: next } });
      isOurs = false;
    },
    setProblems: (problems) => {
      const { doc } = view.state;
      const marks = problems.map((problem): Diagnostic => {
        const from = placeOf(problem.line ?? 1, problem.column ?? 1);
        const word = /^[\w.@]+/.exec(doc.sliceString(from, from + 60))?.[0] ?? ' ';
        const to = Math.min(from + word.length, doc.length);
        const message = problem.message + (problem.hint ? ` (${problem.hint})` : '');
        return { from, to, severity: 'error', message };
      });
      view.dispatch(setDiagnostics(view.state, marks));
    },
    setLinkedLine: (line) => view.dispatch({ effects: linkLine.of(line) }),
    goTo: (line, column) => {
      view.dispatch({ selection: { anchor: placeOf(line, column) }, scrollIntoView: true });
      view.focus();
    },
    focus: () => view.focus(),
  };
}
