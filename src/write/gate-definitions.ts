/**
 * Definitions, in OpenQASM, of the gates of our table that a language's standard header lacks.
 *
 * Convention: for version 3 the bodies are exact, phase included; for 2.0 they are right up to a phase, which
 * is free there. The tests compare every body with the table's matrix.
 */
export type DefinitionText = {
  /** `name(angles) qubits`, as it stands after `gate`. */
  head: string;
  body: string;
  /** Other gates of this file that the body uses. */
  needs?: readonly string[];
};

/** exp(-i angle X/2) on a where a and b differ: in the frame of cx a, b that is a rotation controlled by b. */
const exchange = (name: string, angle: string): DefinitionText => ({
  head: `${name} a, b`,
  body: `cx a, b; crx(${angle}) b, a; cx a, b;`,
});

const DEFINITIONS_3: ReadonlyMap<string, DefinitionText> = new Map(
  Object.entries({
    sxdg: { head: 'sxdg a', body: 'inv @ sx a;' },
    u: { head: 'u(t, f, l) a', body: 'gphase(-t / 2); U(t, f, l) a;' },
    prx: { head: 'prx(t, f) a', body: 'rz(-f) a; rx(t) a; rz(f) a;' },
    csx: { head: 'csx a, b', body: 'ctrl @ sx a, b;' },
    csxdg: { head: 'csxdg a, b', body: 'ctrl @ inv @ sx a, b;' },
    iswap: exchange('iswap', '-pi'),
    iswapdg: exchange('iswapdg', 'pi'),
    sqrtiswap: exchange('sqrtiswap', '-pi / 2'),
    sqrtiswapdg: exchange('sqrtiswapdg', 'pi / 2'),
    ecr: { head: 'ecr a, b', body: 'h b; cx a, b; rz(pi / 2) b; cx a, b; h b; x a;' },
    b: { head: 'b a, c', body: 'cx a, c; rx(-pi / 4) a; crx(-pi / 2) c, a; cx a, c;' },
    bdg: { head: 'bdg a, c', body: 'cx a, c; rx(pi / 4) a; crx(pi / 2) c, a; cx a, c;' },
    cu1: { head: 'cu1(t) a, b', body: 'cp(t) a, b;' },
    cu3: { head: 'cu3(t, f, l) a, b', body: 'ctrl @ u3(t, f, l) a, b;' },
    rxx: {
      head: 'rxx(t) a, b',
      body: 'h a; h b; cx a, b; rz(t) b; cx a, b; h a; h b;',
    },
    ryy: {
      head: 'ryy(t) a, b',
      body: 'rx(pi / 2) a; rx(pi / 2) b; cx a, b; rz(t) b; cx a, b; rx(-pi / 2) a; rx(-pi / 2) b;',
    },
    rzz: { head: 'rzz(t) a, b', body: 'cx a, b; rz(t) b; cx a, b;' },
    ccz: { head: 'ccz a, b, c', body: 'ctrl(2) @ z a, b, c;' },
    rccx: {
      head: 'rccx a, b, c',
      body: 'h c; t c; cx b, c; tdg c; cx a, c; t c; cx b, c; tdg c; h c;',
    },
    c3x: { head: 'c3x a, b, c, d', body: 'ctrl(3) @ x a, b, c, d;' },
    c4x: { head: 'c4x a, b, c, d, e', body: 'ctrl(4) @ x a, b, c, d, e;' },
    c3sqrtx: { head: 'c3sqrtx a, b, c, d', body: 'ctrl(3) @ sx a, b, c, d;' },
    c3sqrtxdg: { head: 'c3sqrtxdg a, b, c, d', body: 'ctrl(3) @ inv @ sx a, b, c, d;' },
  }),
);

/** The same with the controlled rotation written as cu3, which every 2.0 header has. */
const exchange2 = (name: string, angle: string): DefinitionText => ({
  head: `${name} a,b`,
  body: `cx a,b; cu3(${angle},-pi/2,pi/2) b,a; cx a,b;`,
});

const DEFINITIONS_2: ReadonlyMap<string, DefinitionText> = new Map(
  Object.entries({
    phase: { head: 'phase(t) a', body: 'u1(t) a;' },
    cphase: { head: 'cphase(t) a,b', body: 'cu1(t) a,b;' },
    prx: { head: 'prx(t,f) a', body: 'rz(-f) a; rx(t) a; rz(f) a;' },
    csxdg: { head: 'csxdg a,b', body: 'h b; cu1(-pi/2) a,b; h b;' },
    iswap: exchange2('iswap', '-pi'),
    iswapdg: exchange2('iswapdg', 'pi'),
    sqrtiswap: exchange2('sqrtiswap', '-pi/2'),
    sqrtiswapdg: exchange2('sqrtiswapdg', 'pi/2'),
    ecr: { head: 'ecr a,b', body: 'h b; cx a,b; rz(pi/2) b; cx a,b; h b; x a;' },
    b: { head: 'b a,c', body: 'cx a,c; rx(-pi/4) a; cu3(-pi/2,-pi/2,pi/2) c,a; cx a,c;' },
    bdg: { head: 'bdg a,c', body: 'cx a,c; rx(pi/4) a; cu3(pi/2,-pi/2,pi/2) c,a; cx a,c;' },
    ryy: {
      head: 'ryy(t) a,b',
      body: 'rx(pi/2) a; rx(pi/2) b; cx a,b; rz(t) b; cx a,b; rx(-pi/2) a; rx(-pi/2) b;',
    },
    ccz: { head: 'ccz a,b,c', body: 'h c; ccx a,b,c; h c;' },
    // the inverse square root of x is x times its square root
    c3sqrtxdg: { head: 'c3sqrtxdg a,b,c,d', body: 'c3x a,b,c,d; c3sqrtx a,b,c,d;' },
  }),
);

/** The definition of a gate that the language's header lacks. */
export function definitionOf(name: string, language: '2.0' | '3'): DefinitionText | undefined {
  return (language === '3' ? DEFINITIONS_3 : DEFINITIONS_2).get(name);
}
