/**
 * A small checker of XML 1.0 well-formedness for what we write: declaration, elements, attributes, text, the five named entities and
 * character references; no DOCTYPE, comments or CDATA, which we never write. Throws with the offset of the first fault.
 */
export interface XmlElement {
  readonly name: string;
  readonly attributes: ReadonlyMap<string, string>;
  readonly children: readonly XmlElement[];
  readonly text: string;
}

type Open = { name: string; attributes: Map<string, string>; children: XmlElement[]; text: string };

export function parseXml(source: string): XmlElement {
  // XML 1.0 §2.2
  const bad = /[^\t\n\r\u0020-\ud7ff\ue000-\ufffd\u{10000}-\u{10ffff}]/u.exec(source);
  if (bad) throw new Error(`character not allowed at ${bad.index}`);
  const root: Open = { name: '', attributes: new Map(), children: [], text: '' };
  const stack = [root];
  let at = /^<\?xml [^?]*\?>/.exec(source)?.[0].length ?? 0;
  while (at < source.length) {
    const top = stack.at(-1)!;
    if (source[at] !== '<') {
      const end = source.indexOf('<', at);
      const text = source.slice(at, end < 0 ? undefined : end);
      top.text += unescaped(text, at);
      at += text.length;
      continue;
    }
    const tag = /^<(\/?)([A-Za-z_][\w:.-]*)((?:\s+[A-Za-z_][\w:.-]*\s*=\s*(?:"[^"<]*"|'[^'<]*'))*)\s*(\/?)>/.exec(
      source.slice(at),
    );
    if (!tag) throw new Error(`no tag at ${at}: ${source.slice(at, at + 60)}`);
    const [whole, closing, name = '', attributes = '', empty] = tag;
    if (closing) {
      if (top.name !== name) throw new Error(`</${name}> closes <${top.name}> at ${at}`);
      stack.pop();
    } else {
      const element: Open = { name, attributes: attributesOf(attributes, at), children: [], text: '' };
      top.children.push(element);
      if (!empty) stack.push(element);
    }
    at += whole.length;
  }
  if (stack.length !== 1 || root.children.length !== 1 || root.text.trim() !== '')
    throw new Error('not exactly one root element');
  return root.children[0]!;
}

export function find(element: XmlElement, name: string): XmlElement[] {
  return element.children.flatMap((child) => [...(child.name === name ? [child] : []), ...find(child, name)]);
}

function attributesOf(text: string, at: number): Map<string, string> {
  const all = new Map<string, string>();
  for (const [, name = '', quoted = ''] of text.matchAll(/([\w:.-]+)\s*=\s*("[^"]*"|'[^']*')/g)) {
    if (all.has(name)) throw new Error(`attribute ${name} twice at ${at}`);
    all.set(name, unescaped(quoted.slice(1, -1), at));
  }
  return all;
}

const NAMED: Readonly<Record<string, string>> = { amp: '&', lt: '<', gt: '>', quot: '"', apos: "'" };

function unescaped(text: string, at: number): string {
  return text.replace(/&([^;&\s]{0,10};)?/g, (whole, reference: string | undefined) => {
    const name = reference?.slice(0, -1) ?? '';
    const code = /^#(x[0-9a-f]+|\d+)$/i.exec(name)?.[1];
    const character =
      code === undefined
        ? NAMED[name]
        : String.fromCodePoint(code.startsWith('x') ? Number.parseInt(code.slice(1), 16) : Number(code));
    if (character === undefined) throw new Error(`bare or unknown ${whole} near ${at}`);
    return character;
  });
}
