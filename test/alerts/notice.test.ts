import { parse } from 'csv-parse/sync';
import { describe, expect, it } from 'vitest';
import { eventJson, eventsCsv, voevent } from '../../alerts/index.ts';
import { CONTEXT, GLITCH, SITE_STEP } from './samples.ts';
import { find, parseXml } from './wellFormed.ts';

describe('the notice', () => {
  const packet = parseXml(voevent(GLITCH, CONTEXT));
  const one = (name: string) => find(packet, name)[0]!;
  const param = (name: string) => find(packet, 'Param').find((p) => p.attributes.get('name') === name);

  // VOEvent 2.0, IVOA Recommendation 2011-07-11, §3 (root attributes and the order of the parts), from memory: no schema at hand.
  it('has the root and the parts that the Recommendation asks for', () => {
    expect(packet.name).toBe('voe:VOEvent');
    expect(packet.attributes.get('xmlns:voe')).toBe('http://www.ivoa.net/xml/VOEvent/v2.0');
    expect(packet.attributes.get('version')).toBe('2.0');
    expect(packet.attributes.get('role')).toBe('observation');
    expect(packet.attributes.get('ivorn')).toBe('ivo://kestrel-ridge.example/spinvigil#KR0417+31-60123-a-r2');
    expect(packet.children.map((c) => c.name)).toEqual([
      'Who',
      'What',
      'WhereWhen',
      'How',
      'Why',
      'Citations',
      'Description',
    ]);
    expect(one('Date').text).toBe('2023-07-02T03:10:00');
  });

  it('says where and when at the barycentre', () => {
    expect(one('AstroCoordSystem').attributes.get('id')).toBe('TDB-ICRS-BARY');
    // MJD 60123.41 is 2023-06-28 09:50:24
    expect(one('ISOTime').text).toBe('2023-06-28T09:50:24');
    expect(Number(one('Error').text)).toBeCloseTo(0.35 * 86_400, 3);
    // 04:17:32.114, +31:05:09.70 in degrees, by hand
    expect(Number(one('C1').text)).toBeCloseTo((4 + 17 / 60 + 32.114 / 3600) * 15, 6);
    expect(Number(one('C2').text)).toBeCloseTo(31 + 5 / 60 + 9.7 / 3600, 6);
  });

  it('carries every number unrounded, with unit and interval, and leaves out what is unknown', () => {
    expect(param('delta_nu')?.attributes.get('value')).toBe(String(GLITCH.deltaNuHz));
    expect(param('delta_nu')?.attributes.get('unit')).toBe('Hz');
    expect(param('delta_nu_over_nu_low')?.attributes.get('value')).toBe('3e-9');
    expect(param('reference_nu')?.attributes.get('value')).toBe('6.3417701123349');
    expect(param('time_step')).toBeUndefined();
    expect(
      find(packet, 'Param').every(
        (p) => Number.isFinite(Number(p.attributes.get('value'))) || p.attributes.get('dataType') === 'string',
      ),
    ).toBe(true);
  });

  it('keeps hypotheses apart, with their probability', () => {
    const inferences = find(packet, 'Inference').map((i) => [
      find(i, 'Concept')[0]?.text,
      Number(i.attributes.get('probability')),
    ]);
    expect(inferences).toEqual([
      ['glitch', 0.9982],
      ['timing noise alone', 0.0011],
      ['spin-down-rate change', 0.0005],
      ['clock step', 0.0002],
    ]);
  });

  it('cites what it supersedes or retracts', () => {
    expect(one('EventIVORN').attributes.get('cite')).toBe('supersedes');
    expect(one('EventIVORN').text).toBe('ivo://kestrel-ridge.example/spinvigil#KR0417+31-60123-a-r1');
    const gone = parseXml(voevent({ ...GLITCH, state: 'withdrawn' }, CONTEXT));
    expect(find(gone, 'EventIVORN')[0]?.attributes.get('cite')).toBe('retraction');
    expect(find(parseXml(voevent(GLITCH, { ...CONTEXT, cites: null })), 'Citations')).toEqual([]);
  });

  it('a drill is a test packet; a candidate says that it is to be vetted', () => {
    expect(parseXml(voevent(GLITCH, { ...CONTEXT, drill: true })).attributes.get('role')).toBe('test');
    expect(packet.children.at(-1)?.text).toContain('to be vetted before it is announced');
  });

  it('is well-formed whatever the names hold, and gives them back', () => {
    for (const name of ['<&>"\'', ']]>', '--><x>', 'a\u0000b\u000bc', '\ud800', 'ν̇ — “KR”']) {
      const hostile = { ...SITE_STEP, pulsar: name, site: name, pulsars: [name, 'x'], id: name };
      const parsed = parseXml(voevent(hostile, { ...CONTEXT, observatory: { name, contact: name } }));
      const site = find(parsed, 'Param')
        .find((p) => p.attributes.get('name') === 'site')
        ?.attributes.get('value');
      // biome-ignore lint/suspicious/noControlCharactersInRegex: what XML cannot hold
      expect(site).toBe(name.replace(/[\u0000-\u001f\ud800]/g, '\ufffd'));
    }
  });
});

type Row = Readonly<Record<'pulsar' | 'pulsars' | 'delta_nu_hz' | 'delta_nu_dot_low_68', string>>;

describe('the table', () => {
  it('reads back with an RFC 4180 reader, numbers unchanged', () => {
    const events = [GLITCH, SITE_STEP, { ...GLITCH, id: 'q', pulsar: 'a "b", c\r\nd' }];
    const csv = eventsCsv(events);
    const rows = parse(csv, { columns: true, record_delimiter: '\r\n' }) as Row[];
    expect(rows).toHaveLength(3);
    expect(Number(rows[0]?.delta_nu_hz)).toBe(GLITCH.deltaNuHz);
    expect(Number(rows[0]?.delta_nu_dot_low_68)).toBe(-2.6e-15);
    expect(rows[1]?.delta_nu_hz).toBe('');
    expect(rows[1]?.pulsars).toBe('KR 0417+31 | KR 1902-08 | KR 2231+44');
    expect(rows[2]?.pulsar).toBe('a "b", c\ufffdd');
    expect(csv.endsWith('\r\n')).toBe(true);
  });

  it('F-5: no text cell can run as a formula', () => {
    for (const name of ['=1+1', '+SUM(A1)', '-2', '@x', '\t=1', ' =1', '＝1', '\r=1']) {
      const [row] = parse(eventsCsv([{ ...GLITCH, pulsar: name }]), { columns: true }) as Row[];
      expect(row?.pulsar).toMatch(/^['\ufffd]/);
    }
  });
});

describe('the event as JSON', () => {
  it('F-6: is the event, and ends with a line feed', () => {
    expect(JSON.parse(eventJson(SITE_STEP))).toEqual(SITE_STEP);
    expect(eventJson(GLITCH).endsWith('}\n')).toBe(true);
  });
});
