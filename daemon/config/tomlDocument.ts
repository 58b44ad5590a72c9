import { type AST, ParseError, parseTOML } from 'toml-eslint-parser';

/**
 * A TOML file as plain values that remember where they stood. Numbers keep their text besides, because one double does not
 * hold the digits of a spin frequency.
 */
export interface TomlDocument {
  readonly root: TomlTable;
  /** Where the value or, failing that, the nearest table around it stands. */
  placeOf(path: TomlPath): Place;
  /** The digits of a number or the content of a text, as they stand in the file; null for anything else. */
  textOf(path: TomlPath): string | null;
}

export interface TomlTable {
  [key: string]: TomlValue;
}
export type TomlValue = string | number | boolean | Date | TomlValue[] | TomlTable;
export type TomlPath = readonly (string | number)[];

/** Both counted from 1. */
export interface Place {
  readonly line: number;
  readonly column: number;
}

export interface TomlFault extends Place {
  readonly message: string;
}

export function parseToml(text: string): TomlDocument | TomlFault {
  try {
    return documentOf(parseTOML(text, { tomlVersion: '1.0' }));
  } catch (error) {
    if (error instanceof ParseError) {
      return { message: error.message, line: error.lineNumber, column: error.column + 1 };
    }
    if (error instanceof RangeError) return { message: 'nested too deeply', line: 1, column: 1 };
    throw error;
  }
}

export function isFault(result: TomlDocument | TomlFault): result is TomlFault {
  return 'message' in result;
}

function documentOf(program: AST.TOMLProgram): TomlDocument {
  const places = new Map<string, Place>();
  const texts = new Map<string, string>();
  const root = emptyTable();
  const note = (path: TomlPath, node: AST.TOMLNode) => {
    const id = JSON.stringify(path);
    if (!places.has(id)) places.set(id, { line: node.loc.start.line, column: node.loc.start.column + 1 });
  };

  const assign = (table: TomlTable, path: TomlPath, pair: AST.TOMLKeyValue) => {
    let into = table;
    const at = [...path];
    for (const [index, key] of pair.key.keys.entries()) {
      const name = key.type === 'TOMLBare' ? key.name : key.value;
      at.push(name);
      note(at, key);
      if (index < pair.key.keys.length - 1) into = tableAt(into, name);
      else setOwn(into, name, plainValue(pair.value, at));
    }
  };

  const plainValue = (node: AST.TOMLContentNode, path: TomlPath): TomlValue => {
    if (node.type === 'TOMLArray') {
      return node.elements.map((element, index) => {
        note([...path, index], element);
        return plainValue(element, [...path, index]);
      });
    }
    if (node.type === 'TOMLInlineTable') {
      const table = emptyTable();
      for (const pair of node.body) assign(table, path, pair);
      return table;
    }
    if (node.kind === 'string') texts.set(JSON.stringify(path), node.value);
    if (node.kind === 'float' || node.kind === 'integer') texts.set(JSON.stringify(path), node.number);
    return node.value;
  };

  for (const node of program.body[0].body) {
    if (node.type === 'TOMLKeyValue') {
      assign(root, [], node);
      continue;
    }
    note(node.resolvedKey, node.key);
    const table = tableOf(root, node.resolvedKey);
    for (const pair of node.body) assign(table, node.resolvedKey, pair);
  }
  return {
    root,
    placeOf: (path) => nearestPlace(places, path),
    textOf: (path) => texts.get(JSON.stringify(path)) ?? null,
  };
}

function nearestPlace(places: ReadonlyMap<string, Place>, path: TomlPath): Place {
  for (let length = path.length; length > 0; length -= 1) {
    const place = places.get(JSON.stringify(path.slice(0, length)));
    if (place !== undefined) return place;
  }
  return { line: 1, column: 1 };
}

/** Without a prototype, so that a key named `__proto__` is a key like any other. */
function emptyTable(): TomlTable {
  return Object.create(null) as TomlTable;
}

function setOwn(table: TomlTable, key: string, value: TomlValue): void {
  Object.defineProperty(table, key, { value, enumerable: true, writable: true, configurable: true });
}

function tableAt(table: TomlTable, key: string): TomlTable {
  const present = table[key];
  if (present !== undefined) return present as TomlTable;
  const fresh = emptyTable();
  setOwn(table, key, fresh);
  return fresh;
}

/** Walks to a table by its resolved key (`["feed", 1]`), making what is not there yet. The parser has refused clashes. */
function tableOf(root: TomlTable, path: TomlPath): TomlTable {
  let table = root;
  for (let index = 0; index < path.length; index += 1) {
    const key = path[index] as string;
    const position = path[index + 1];
    if (typeof position !== 'number') {
      table = tableAt(table, key);
      continue;
    }
    if (table[key] === undefined) setOwn(table, key, []);
    const list = table[key] as TomlTable[];
    list[position] ??= emptyTable();
    table = list[position];
    index += 1;
  }
  return table;
}
