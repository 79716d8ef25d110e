/**
 * The one style sheet of every picture: ink, paper and one accent, by the reader's choice of light or dark.
 *
 * What enters and what leaves is told by shape and by name, and the stretches of a shared wire by two tints
 * that also differ in lightness, so that no meaning hangs on telling colours apart.
 */
export const PICTURE_STYLE = `
.wg{color:var(--ink,#20262b);font-family:var(--text,Georgia,"Times New Roman",serif)}
.wg .paper{fill:var(--paper,#fffefb)}
.wg .wire,.wg .stroke,.wg .link,.wg .bits,.wg .pass,.wg .barrier,.wg .bracket,.wg .axis{stroke:currentColor;fill:none}
.wg .wire{stroke-width:1}.wg .stroke,.wg .link{stroke-width:1.4}.wg .thin{stroke-width:1.2}
.wg .bits{stroke-width:.9}.wg .pass{stroke-width:1;stroke-dasharray:1 3}
.wg .barrier{stroke-width:1.2;stroke-dasharray:3 4;opacity:.6}
.wg .box,.wg .plus,.wg .ring{fill:var(--paper,#fffefb);stroke:currentColor;stroke-width:1.2}
.wg .dot{fill:currentColor}
.wg .gap{stroke:var(--paper,#fffefb);stroke-width:4;fill:none}
.wg text{fill:currentColor;text-anchor:middle}
.wg .start{text-anchor:start}.wg .end{text-anchor:end}
.wg .name{font-size:14px}.wg .tiny{font-size:9.5px}
.wg .angle,.wg .operand{font-size:10px;font-family:var(--label,system-ui,sans-serif)}
.wg .operand{font-size:8.5px;opacity:.75}
.wg .label{font-size:13px;text-anchor:end}
.wg .note{font-size:11px;font-family:var(--label,system-ui,sans-serif);opacity:.8}
.wg .life{fill:var(--tint,#d5e8e4)}.wg .life.odd{fill:var(--tint-2,#ece9df)}
.wg .flag{fill:var(--accent,#0c6b62)}
.wg .flag.leaves{fill:var(--paper,#fffefb);stroke:var(--accent,#0c6b62);stroke-width:1.4}
.wg .flagname{font-size:11px;font-family:var(--label,system-ui,sans-serif);font-weight:600}
.wg .enters+.flagname{fill:var(--paper,#fffefb)}
.wg .leaves+.flagname{fill:var(--accent,#0c6b62)}
.wg .bracket{stroke-width:1;opacity:.7}
.wg .grid{stroke:currentColor;stroke-width:1;opacity:.16}
.wg .step{fill:none;stroke:var(--accent,#0c6b62);stroke-width:1.8}
.wg .point{fill:var(--accent,#0c6b62);stroke:var(--paper,#fffefb);stroke-width:1.5}
.wg .point.hollow{fill:var(--paper,#fffefb);stroke:currentColor;stroke-width:1.4}
`;

/** For a picture that stands alone: the colours too, and dark ones where the reader asks for them. */
export const STANDALONE_STYLE = `${PICTURE_STYLE}
@media (prefers-color-scheme:dark){.wg{--ink:#e6e4dd;--paper:#15191b;--accent:#6cc5b8;--tint:#1f3d3a;--tint-2:#2b2e2d}}
`;
