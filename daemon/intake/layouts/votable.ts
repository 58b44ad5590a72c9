import { isUtf8 } from 'node:buffer';
import { StringDecoder } from 'node:string_decoder';
import { SaxesParser } from 'saxes';
import { visibleText } from '../../visibleText.ts';
import { type ArrivalFile, faulty } from '../rows.ts';
import { textBody } from './textBytes.ts';
import { VotableFault, VotableTables } from './votableTables.ts';

/**
 * Layout `votable`: the rows of every table of an IVOA VOTable (1.0 to 1.5) that has the columns of an arrival, as TABLEDATA or
 * BINARY2. Rows are counted through the file. A DOCTYPE is refused, so that no entity can grow or reach outside; nothing that
 * the file points to is fetched, and nothing is unpacked.
 */
export function readVotable(received: Buffer): ArrivalFile {
  const body = textBody(received);
  if ('fault' in body) return faulty(body.fault);
  if (!isUtf8(body.bytes)) return faulty('is not UTF-8 text');
  try {
    return parse(body.bytes);
  } catch (error) {
    if (error instanceof VotableFault) return faulty(error.message, { unterminated: error.cutShort });
    throw error;
  }
}

const CHUNK_BYTES = 64 * 1024;
const DEEPEST = 50;

function parse(bytes: Buffer): ArrivalFile {
  const parser = new SaxesParser({ xmlns: false, position: true });
  const tables = new VotableTables();
  let isAtEnd = false;
  const fail = (reason: string, options?: { readonly cutShort: boolean }): never => {
    throw new VotableFault(`line ${parser.line}, column ${parser.columnIndex + 1}: ${reason}`, options);
  };
  parser.on('error', (error) => {
    const words = visibleText(error.message.replace(/^[0-9]+:[0-9]+: /, '')).slice(0, 200);
    fail(words, { cutShort: isAtEnd });
  });
  parser.on('doctype', () => fail('a DOCTYPE is not taken'));
  parser.on('xmldecl', ({ encoding }) => {
    if (encoding !== undefined && !/^(utf-?8|us-ascii)$/i.test(encoding)) {
      fail(`the encoding ${visibleText(encoding).slice(0, 40)} is not taken; deliver it as UTF-8`);
    }
  });
  let depth = 0;
  parser.on('opentag', ({ name, attributes }) => {
    depth += 1;
    if (depth > DEEPEST) fail(`elements are nested more than ${DEEPEST} deep`);
    if (depth === 1 && localName(name) !== 'VOTABLE') fail(`is not a VOTable: its root is ${visibleText(name)}`);
    tables.open(localName(name), attributes, parser.line);
  });
  parser.on('closetag', ({ name }) => {
    depth -= 1;
    tables.close(localName(name));
  });
  parser.on('text', (text) => tables.text(text));
  parser.on('cdata', (text) => tables.text(text));

  const decoder = new StringDecoder('utf8');
  for (let at = 0; at < bytes.length; at += CHUNK_BYTES) {
    parser.write(decoder.write(bytes.subarray(at, at + CHUNK_BYTES)));
  }
  isAtEnd = true;
  parser.close();
  return tables.result();
}

function localName(name: string): string {
  return name.slice(name.indexOf(':') + 1);
}
