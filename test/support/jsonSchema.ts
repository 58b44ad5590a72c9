/**
 * A small checker of JSON Schema, draft 2020-12, for the words that our own schema uses; any other word is an error, so that none
 * is passed over in silence. Written from the specification, from memory.
 */
export type Schema = Readonly<Record<string, unknown>>;

const REMARKS = new Set(['$schema', '$id', 'title', 'description', '$defs']);

/** Complaints, each with its place; none: valid. */
export function complaints(value: unknown, schema: Schema, root: Schema = schema, at = '$'): string[] {
  return Object.entries(schema).flatMap(([word, argument]) => {
    if (REMARKS.has(word)) return [];
    const check = WORDS[word];
    if (check === undefined) throw new Error(`the checker does not know "${word}"`);
    return check(value, argument, { root, at, schema });
  });
}

interface Place {
  readonly root: Schema;
  readonly at: string;
  readonly schema: Schema;
}
type Check = (value: unknown, argument: unknown, place: Place) => string[];

const isObject = (value: unknown): value is Readonly<Record<string, unknown>> =>
  typeof value === 'object' && value !== null && !Array.isArray(value);
const when = (wrong: boolean, at: string, what: string) => (wrong ? [`${at} ${what}`] : []);
const bound =
  (name: string, fails: (value: number, limit: number) => boolean): Check =>
  (value, limit, { at }) =>
    when(typeof value === 'number' && fails(value, limit as number), at, `breaks ${name} ${limit}`);
const length =
  (name: string, size: (value: unknown) => number | null, fails: (size: number, limit: number) => boolean): Check =>
  (value, limit, { at }) => {
    const found = size(value);
    return when(found !== null && fails(found, limit as number), at, `breaks ${name} ${limit}`);
  };
const items = (value: unknown) => (Array.isArray(value) ? value.length : null);

const WORDS: Readonly<Record<string, Check>> = {
  type: (value, types, { at }) =>
    when(![types].flat().some((type) => isOf(value, type as string)), at, `is no ${types}`),
  enum: (value, allowed, { at }) => when(!(allowed as unknown[]).includes(value), at, `is none of ${allowed}`),
  required: (value, names, { at }) =>
    isObject(value)
      ? (names as string[]).flatMap((name) => when(!Object.hasOwn(value, name), at, `has no ${name}`))
      : [],
  properties: (value, schemas, { root, at }) =>
    isObject(value)
      ? Object.entries(schemas as Record<string, Schema>).flatMap(([name, schema]) =>
          Object.hasOwn(value, name) ? complaints(value[name], schema, root, `${at}.${name}`) : [],
        )
      : [],
  additionalProperties: (value, schema, { root, at, schema: around }) => {
    const named = Object.keys((around['properties'] ?? {}) as object);
    if (!isObject(value)) return [];
    const others = Object.entries(value).filter(([name]) => !named.includes(name));
    return others.flatMap(([name, inner]) => complaints(inner, schema as Schema, root, `${at}.${name}`));
  },
  items: (value, schema, { root, at }) =>
    Array.isArray(value) ? value.flatMap((inner, i) => complaints(inner, schema as Schema, root, `${at}[${i}]`)) : [],
  anyOf: (value, schemas, { root, at }) =>
    when(
      (schemas as Schema[]).every((schema) => complaints(value, schema, root, at).length > 0),
      at,
      'fits none',
    ),
  $ref: (value, path, { root, at }) => {
    const name = /^#\/\$defs\/(\w+)$/.exec(path as string)?.[1] ?? '';
    const target = (root['$defs'] as Record<string, Schema>)[name];
    if (target === undefined) throw new Error(`${path} is not there`);
    return complaints(value, target, root, at);
  },
  minimum: bound('minimum', (value, limit) => value < limit),
  maximum: bound('maximum', (value, limit) => value > limit),
  exclusiveMinimum: bound('exclusiveMinimum', (value, limit) => value <= limit),
  minLength: length(
    'minLength',
    (value) => (typeof value === 'string' ? [...value].length : null),
    (n, limit) => n < limit,
  ),
  minItems: length('minItems', items, (n, limit) => n < limit),
  maxItems: length('maxItems', items, (n, limit) => n > limit),
  minProperties: length(
    'minProperties',
    (value) => (isObject(value) ? Object.keys(value).length : null),
    (n, limit) => n < limit,
  ),
};

function isOf(value: unknown, type: string): boolean {
  if (type === 'null') return value === null;
  if (type === 'array') return Array.isArray(value);
  if (type === 'object') return isObject(value);
  if (type === 'integer') return Number.isInteger(value);
  return typeof value === type;
}
