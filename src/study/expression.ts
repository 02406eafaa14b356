/**
 * Small expressions over named values: constraints between axes, what a package costs, what it has to reach. Numbers may carry a
 * unit (`12 GT/s`, `3 TB/s`, `20 us`, `85 %`); two sides that are compared, added or subtracted must be of one kind.
 *
 *     rate >= 12 GT/s or queue <= 32
 *     6 * stacks + lanes / 256
 *     page == 'open' and not (queue > 64)
 */
import { InputError, nearest, type Where } from '../errors.js';
import { type Quantity, type QuantityKind, UNITS } from '../units.js';

/** A named value: a quantity, or text that can only be compared for being equal. */
export type Value = Quantity | string;

export interface Expression {
  readonly text: string;
  readonly where: Where;
  readonly names: readonly string[]; // the values it asks for
  /** The number it comes to, in the base unit of its kind; a condition is 1 or 0, NaN when a value it needs is missing. */
  evaluate(values: (name: string) => Value | undefined): number;
}

type Node = (values: (name: string) => Value | undefined) => Value | undefined;

interface Token {
  readonly kind: 'quantity' | 'text' | 'name' | 'sign' | 'end';
  readonly text: string;
  readonly at: number; // from 0
  readonly quantity?: Quantity;
}

const LEVELS = [['or'], ['and'], ['==', '!=', '<=', '>=', '<', '>'], ['+', '-'], ['*', '/']] as const;
const UNIT_NAMES = [...UNITS.keys()].sort((a, b) => b.length - a.length);

/** Understands an expression; `known` are the names it may use. Throws InputError at `where`. */
export function parseExpression(text: string, known: (name: string) => string | null, where: Where): Expression {
  const wrong = (token: Token, expected: string, hint?: string): InputError =>
    new InputError({
      where,
      found: `${token.kind === 'end' ? 'its end' : `'${token.text}'`} at character ${token.at + 1} of '${text}'`,
      expected,
      hint,
    });
  const tokens = tokensOf(text, where);
  const names = new Set<string>();
  let next = 0;
  const is = (words: readonly string[]): boolean =>
    ['sign', 'name'].includes(tokens[next].kind) && words.includes(tokens[next].text);

  const level = (depth: number): Node => {
    if (depth === LEVELS.length) return unary();
    let left = level(depth + 1);
    while (is(LEVELS[depth])) {
      const sign = tokens[next++];
      const [a, b] = [left, level(depth + 1)];
      left = (values) =>
        operate(sign.text, a(values), b(values), (found) => wrong(sign, 'two sides of one kind', found));
    }
    return left;
  };
  const unary = (): Node => {
    const token = tokens[next];
    if (is(['not', '-'])) {
      next++;
      const of = unary();
      return (values) => {
        const value = of(values);
        if (value === undefined) return undefined;
        if (typeof value === 'string') throw wrong(token, 'a number behind it');
        return token.text === '-' ? { ...value, value: -value.value } : truth(value.value === 0);
      };
    }
    next++;
    if (token.kind === 'quantity') return () => token.quantity;
    if (token.kind === 'text') return () => token.text;
    if (token.kind === 'sign' && token.text === '(') {
      const inner = level(0);
      if (!is([')'])) throw wrong(tokens[next], "')'");
      next++;
      return inner;
    }
    if (token.kind !== 'name') throw wrong(token, "a name, a number with its unit, a 'word' in quotes or '('");
    const problem = known(token.text);
    if (problem !== null) throw wrong(token, problem);
    names.add(token.text);
    return (values) => values(token.text);
  };

  const root = level(0);
  if (tokens[next].kind !== 'end') throw wrong(tokens[next], 'and, or, a comparison, + - * / or its end');
  return {
    text,
    where,
    names: [...names],
    evaluate: (values) => {
      const value = root(values);
      if (value === undefined) return Number.NaN;
      if (typeof value !== 'string') return value.value;
      throw new InputError({ where, found: `the text '${value}' from '${text}'`, expected: 'a number or a condition' });
    },
  };
}

/** `known` for a fixed list of names. */
export function oneOf(names: readonly string[]): (name: string) => string | null {
  return (name) => {
    if (names.includes(name)) return null;
    const like = nearest(name, names);
    return like === undefined ? `one of ${names.join(', ')}` : `'${like}'`;
  };
}

const truth = (holds: boolean): Quantity => ({ value: holds ? 1 : 0, kind: 'number' });

function operate(
  sign: string,
  a: Value | undefined,
  b: Value | undefined,
  differ: (hint: string) => InputError,
): Value | undefined {
  if (a === undefined || b === undefined) return undefined;
  if (typeof a === 'string' || typeof b === 'string') {
    if (typeof a !== typeof b || (sign !== '==' && sign !== '!=')) {
      throw differ(`Text can only be compared by == and != with text, and here is ${word(a)} ${sign} ${word(b)}`);
    }
    return truth((a === b) === (sign === '=='));
  }
  if (sign === 'or' || sign === 'and') {
    return truth(sign === 'or' ? a.value !== 0 || b.value !== 0 : a.value !== 0 && b.value !== 0);
  }
  if (sign === '*' || sign === '/') {
    const value = sign === '*' ? a.value * b.value : a.value / b.value;
    // a multiple of a quantity stays one; what else comes out has no unit of ours
    const kind: QuantityKind = b.kind === 'number' ? a.kind : sign === '*' && a.kind === 'number' ? b.kind : 'number';
    return { value, kind };
  }
  // a plain number goes with every kind: it is in the base unit
  if (a.kind !== b.kind && a.kind !== 'number' && b.kind !== 'number') {
    throw differ(`Left of it is a ${a.kind}, right of it a ${b.kind}`);
  }
  const kind = a.kind === 'number' ? b.kind : a.kind;
  switch (sign) {
    case '+':
      return { value: a.value + b.value, kind };
    case '-':
      return { value: a.value - b.value, kind };
    case '<':
      return truth(a.value < b.value);
    case '>':
      return truth(a.value > b.value);
    case '<=':
      return truth(a.value <= b.value);
    case '>=':
      return truth(a.value >= b.value);
    default:
      return truth((a.value === b.value) === (sign === '=='));
  }
}

const word = (value: Value): string => (typeof value === 'string' ? `'${value}'` : `a ${value.kind}`);

function tokensOf(text: string, where: Where): Token[] {
  const tokens: Token[] = [];
  let at = 0;
  while (at < text.length) {
    const rest = text.slice(at);
    const blank = /^\s+/.exec(rest);
    if (blank !== null) {
      at += blank[0].length;
      continue;
    }
    const number = /^(?:\d+\.?\d*|\.\d+)(?:e[-+]?\d+)?/i.exec(rest);
    const quoted = /^(?:'([^']*)'|"([^"]*)")/.exec(rest);
    const name = /^[A-Za-z_][\w.-]*/.exec(rest);
    const sign = /^(?:==|!=|<=|>=|[<>+\-*/()])/.exec(rest);
    if (number !== null) {
      const [length, quantity] = withUnit(number[0], rest);
      tokens.push({ kind: 'quantity', text: rest.slice(0, length), at, quantity });
      at += length;
    } else if (quoted !== null) {
      tokens.push({ kind: 'text', text: quoted[1] ?? quoted[2], at });
      at += quoted[0].length;
    } else if (name !== null || sign !== null) {
      const [found] = (name ?? sign) as RegExpExecArray;
      tokens.push({ kind: name === null ? 'sign' : 'name', text: found, at });
      at += found.length;
    } else {
      const found = `'${text[at]}' at character ${at + 1} of '${text}'`;
      throw new InputError({
        where,
        found,
        expected: 'names, numbers with units, comparisons, and, or, not, + - * / ( )',
      });
    }
  }
  tokens.push({ kind: 'end', text: '', at: text.length });
  return tokens;
}

/** A number with the unit behind it, if one is there: the longest that ends where a word ends. */
function withUnit(number: string, rest: string): [length: number, quantity: Quantity] {
  const behind = rest.slice(number.length);
  const gap = /^\s*/.exec(behind)?.[0].length ?? 0;
  const unit = UNIT_NAMES.find(
    (name) => behind.startsWith(name, gap) && !/^(\w|\/[A-Za-z])/.test(behind.slice(gap + name.length)),
  );
  if (unit === undefined) return [number.length, { value: Number(number), kind: 'number' }];
  const [kind, factor] = UNITS.get(unit) as readonly [QuantityKind, number];
  const value = Number((Number(number) * factor).toPrecision(15));
  return [number.length + gap + unit.length, { value, kind }];
}
