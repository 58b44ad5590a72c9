import { readdirSync, readFileSync } from 'node:fs';
import { dirname, join, posix, relative, sep } from 'node:path';
import { fileURLToPath } from 'node:url';
import { parseSync } from 'vite';

/** The repository's TypeScript as data, for the rules of architecture.test.ts. Paths are relative to the root, with `/`. */
export interface SourceFile {
  readonly path: string;
  readonly bytes: number;
  readonly imports: readonly Import[];
  /** Every use of a name that the file does not declare as a member: `Math.random`, `console`, `new Date()` … */
  readonly uses: readonly Use[];
  readonly strings: readonly Located[];
  readonly topLevelMutables: readonly Located[];
  readonly functions: readonly { readonly line: number; readonly lines: number }[];
}

export interface Import {
  readonly line: number;
  /** As written. */
  readonly specifier: string;
  /** The file it names when relative; null for a package or a builtin. */
  readonly target: string | null;
  /** `import type …`: gone when the program runs. */
  readonly typeOnly: boolean;
}

export interface Located {
  readonly line: number;
  readonly text: string;
}

/** `text` is `name` or `name.member`; `withoutArguments` marks a bare call or construction such as `new Date()`. */
export interface Use extends Located {
  readonly withoutArguments: boolean;
}

export const ROOT = join(dirname(fileURLToPath(import.meta.url)), '..', '..');

/** Every .ts file below the given folders. */
export function readSources(folders: readonly string[]): SourceFile[] {
  return folders.flatMap((folder) =>
    readdirSync(join(ROOT, folder), { recursive: true, withFileTypes: true })
      .filter((entry) => entry.isFile() && entry.name.endsWith('.ts'))
      .map((entry) => relative(ROOT, join(entry.parentPath, entry.name)).split(sep).join('/'))
      .sort()
      .map((path) => parseSource(path, readFileSync(join(ROOT, path), 'utf8'))),
  );
}

/** The parts of a syntax-tree node (ESTree) that the rules look at. */
interface Node {
  readonly type: string;
  readonly start: number;
  readonly end: number;
  readonly name?: string;
  readonly value?: unknown;
  readonly kind?: string;
  readonly computed?: boolean;
  readonly object?: Node;
  readonly property?: Node;
  readonly key?: Node;
  readonly callee?: Node;
  readonly arguments?: readonly Node[];
  readonly declaration?: Node | null;
  readonly body?: Node | readonly Node[] | null;
}

/** Throws if the text is not TypeScript. */
export function parseSource(path: string, text: string): SourceFile {
  const { program, module, errors } = parseSync(path, text, {});
  if (errors.length > 0) throw new Error(`${path}: ${errors[0]?.message}`);
  const lineAt = lineFinder(text);
  const uses: Use[] = [];
  const strings: Located[] = [];
  const functions: { line: number; lines: number }[] = [];

  const walk = (node: Node, parent: Node | null): void => {
    const line = lineAt(node.start);
    if (node.type === 'Identifier') {
      const use = outsideUse(node, parent);
      if (use !== null) uses.push({ line, ...use });
    } else if (node.type === 'Literal' && typeof node.value === 'string') {
      strings.push({ line, text: node.value });
    } else if (node.type === 'TemplateLiteral') {
      strings.push({ line, text: text.slice(node.start + 1, node.end - 1) });
    } else if (FUNCTIONS.has(node.type) && node.body !== null) {
      functions.push({ line, lines: lineAt(node.end) - line + 1 });
    }
    for (const child of childrenOf(node)) walk(child, node);
  };
  const root = program as Node;
  walk(root, null);

  const specifiers = [
    ...module.staticImports.map((found) => ({ start: found.start, specifier: found.moduleRequest.value })),
    ...module.staticExports.flatMap(({ start, entries }) =>
      entries.flatMap(({ moduleRequest }) => (moduleRequest ? [{ start, specifier: moduleRequest.value }] : [])),
    ),
    ...module.dynamicImports.map(({ start, moduleRequest }) => ({
      start,
      specifier: text.slice(moduleRequest.start, moduleRequest.end).replace(/^['"`]|['"`]$/g, ''),
    })),
  ];
  return {
    path,
    bytes: Buffer.byteLength(text),
    imports: specifiers.map(({ start, specifier }) => ({
      line: lineAt(start),
      specifier,
      typeOnly: /^(import|export)\s+type\b/.test(text.slice(start, start + 20)),
      target: specifier.startsWith('.') ? posix.join(posix.dirname(path), specifier) : null,
    })),
    uses,
    strings,
    topLevelMutables: topLevelMutables(root, text, lineAt),
    functions,
  };
}

const FUNCTIONS = new Set(['FunctionDeclaration', 'FunctionExpression', 'ArrowFunctionExpression']);

const VALUE_WRAPPERS = new Set(['TSAsExpression', 'TSSatisfiesExpression', 'TSNonNullExpression']);

function childrenOf(node: Node): Node[] {
  return Object.values(node)
    .flat()
    .filter(
      (value): value is Node => typeof value === 'object' && value !== null && 'type' in value && 'start' in value,
    );
}

/** What an identifier reaches for: null where it is only the name of a member or a key. */
function outsideUse(node: Node, parent: Node | null): { text: string; withoutArguments: boolean } | null {
  const name = node.name ?? '';
  if (parent === null) return null;
  if (parent.type === 'MemberExpression') {
    if (parent.property === node && parent.computed !== true) return null;
    const property = parent.property!;
    const member = property.type === 'Identifier' ? `${name}.${property.name}` : name;
    return { text: parent.object === node ? member : name, withoutArguments: false };
  }
  if (
    (parent.type === 'Property' || parent.type === 'PropertyDefinition') &&
    parent.key === node &&
    parent.value !== node
  ) {
    return null;
  }
  if (parent.type.startsWith('TS') && !VALUE_WRAPPERS.has(parent.type)) return null;
  const called = (parent.type === 'NewExpression' || parent.type === 'CallExpression') && parent.callee === node;
  return { text: name, withoutArguments: called && parent.arguments?.length === 0 };
}

function topLevelMutables(program: Node, text: string, lineAt: (offset: number) => number): Located[] {
  return (program.body as Node[])
    .map((statement) =>
      statement.type === 'ExportNamedDeclaration' ? (statement.declaration ?? statement) : statement,
    )
    .filter((statement) => statement.type === 'VariableDeclaration' && statement.kind !== 'const')
    .map((statement) => ({
      line: lineAt(statement.start),
      text: text.slice(statement.start, statement.end).slice(0, 60),
    }));
}

function lineFinder(text: string): (offset: number) => number {
  const starts = [0];
  for (let at = text.indexOf('\n'); at !== -1; at = text.indexOf('\n', at + 1)) starts.push(at + 1);
  return (offset) => {
    let low = 0;
    let high = starts.length;
    while (high - low > 1) {
      const middle = (low + high) >> 1;
      if (starts[middle]! <= offset) low = middle;
      else high = middle;
    }
    return low + 1;
  };
}
