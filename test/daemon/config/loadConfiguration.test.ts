import { chmodSync, existsSync, mkdirSync, rmSync, symlinkSync, writeFileSync } from 'node:fs';
import { basename, join } from 'node:path';
import { describe, expect, it } from 'vitest';
import { loadConfiguration } from '../../../daemon/config/loadConfiguration.ts';
import {
  CONFIGURATION,
  type ConfigurationFiles,
  PULSAR,
  writeConfiguration,
} from '../../support/configurationFolder.ts';
import { useTemporaryFolders } from '../../support/temporaryFolder.ts';

const newFolder = useTemporaryFolders();

/** The complaints as `file:line:column severity message`, without the folder. */
function complaints(
  files: ConfigurationFiles,
  { folder = newFolder(), environment = {} as NodeJS.ProcessEnv } = {},
): string[] {
  const { configuration, problems } = loadConfiguration(writeConfiguration(folder, files), { environment });
  expect(configuration === null).toBe(problems.some(({ severity }) => severity === 'error'));
  return problems.map(
    ({ file, line, column, message, severity }) =>
      `${basename(file)}:${line}:${column} ${severity} ${message.replaceAll(`${folder}/`, '')}`,
  );
}

const changed = (from: string, to: string): ConfigurationFiles => {
  expect(CONFIGURATION).toContain(from);
  return { configuration: CONFIGURATION.replace(from, to) };
};
const smtp = (keys: string) => changed('transport = "folder"\nfolder = "mail"', `transport = "smtp"\n${keys}`);

describe('a configuration', () => {
  it('is loaded with all that it names, and its defaults', () => {
    const folder = newFolder();
    const { configuration, problems } = loadConfiguration(writeConfiguration(folder));
    expect(problems).toEqual([]);
    expect(configuration).toMatchObject({
      observatory: { name: 'Kestrel Ridge' },
      stateFolder: join(folder, 'state'),
      earth: { orientation: null, ttBipm: null, kernel: null, kernels: new Map() },
      sites: [{ name: 'ridge', itrfM: [-2390490, 5564764, 1994727] }],
      feeds: [
        {
          name: 'nightly',
          folder: join(folder, 'arrivals'),
          layout: 'csv',
          columns: null,
          recursive: false,
          pollSeconds: 30,
          polling: false,
          expectEveryHours: null,
        },
      ],
      budget: { falseAlertsPerYear: 1 },
      mail: {
        transport: { kind: 'folder', folder: join(folder, 'mail') },
        to: ['duty@kestrel.example'],
        digestCron: '0 8 * * *',
        historicalAfterDays: 30,
        updateWhenSharperBy: 2,
        mailSuspected: false,
        quietHours: null,
        mostPerHour: 10,
        alsoTo: [],
      },
      review: {
        host: '127.0.0.1',
        port: 0,
        reviewers: ['duty', 'timing'],
        passwordFile: join(folder, 'state', 'reviewers.json'),
        tls: null,
        proxy: null,
        monitorTokenFile: null,
      },
      heartbeat: { web: null, mail: null },
    });
    expect([...configuration!.sites[0]!.clockTable!.mjd]).toEqual([58000, 61000]);
    expect([...configuration!.models.keys()]).toEqual(['KR 0417+31']);
    expect(existsSync(join(folder, 'state'))).toBe(false);
  });

  it('needs no [review] section and no site', () => {
    const configuration = CONFIGURATION.replace(/\[review\][\s\S]*/, '').replace(
      /\[\[site\]\][\s\S]*?(?=\[\[feed)/,
      '',
    );
    const loaded = loadConfiguration(writeConfiguration(newFolder(), { configuration }));
    expect(loaded.problems).toEqual([]);
    expect(loaded.configuration).toMatchObject({ sites: [], review: { host: '127.0.0.1', port: 8417, reviewers: [] } });
  });

  it('F-7 complains about everything at once, each at its place', () => {
    const configuration = CONFIGURATION.replace('contact', 'contakt')
      .replace('1.0\n', '"one"\n')
      .replace('layout = "csv"', 'layout = "fits"\npoll_minutes = 5')
      .replace('0 8 * * *', '0 25 * * *')
      .replace('UTC', 'Mars/Olympus')
      .replace('127.0.0.1:0', '0.0.0.0:80');
    const models = {
      'a.toml': PULSAR.replace('41.27', '-1'),
      'b.toml': 'name = ',
      'c.toml': PULSAR.replace('04:17', '24:17'),
    };
    expect(complaints({ configuration, models, clock: 'mjd,add_seconds\n1,x\n' })).toEqual([
      'spinvigil.toml:1:2 error observatory, contact: is missing',
      'spinvigil.toml:3:1 error observatory, contakt: unknown key; did you mean "contact"?',
      'ridge.csv:2:null error column add_seconds: "x" is not a number',
      'spinvigil.toml:14:1 error feed 1, poll_minutes: unknown key; did you mean "poll_seconds"?',
      'spinvigil.toml:18:1 error budget, false_alerts_per_year: must be a number, found a text',
      'spinvigil.toml:24:1 error mail, timezone: "Mars/Olympus" is not a time zone; write an IANA name such as "Europe/Berlin" or "UTC"',
      'spinvigil.toml:25:1 error mail, digest_cron: hour "25" is not a number from 0 to 23, a range or a step',
      'spinvigil.toml:27:1 error review, listen: 0.0.0.0 can be reached from other machines: give tls_certificate_file and tls_key_file, or behind_proxy with proxy_address, or listen on 127.0.0.1 and come through an SSH tunnel',
      'a.toml:7:1 error dispersion_measure: must be between 0 and 10000 pc cm⁻³, found -1',
      'b.toml:1:8 error Unspecified values are invalid',
      'c.toml:2:1 error right_ascension: must be "hh:mm:ss.s" or degrees from 0 to 360, found "24:17:32.114"',
    ]);
  });

  it('F-7 says where the text is no TOML', () => {
    expect(complaints({ configuration: '[a]\nx = 1\nx = 2\n' })).toEqual([
      'spinvigil.toml:3:1 error Defining a key multiple times is invalid',
    ]);
    expect(complaints({ configuration: `a = ${'['.repeat(100_000)}` })).toHaveLength(1);
    expect(loadConfiguration(join(newFolder(), 'none.toml')).problems).toMatchObject([
      { line: null, message: 'does not exist' },
    ]);
  });

  it('F-7 is not misled by keys that JavaScript knows', () => {
    const found = complaints(changed('[state]', '__proto__.polluted = 1\nconstructor = 2\n[state]'));
    expect(found).toHaveLength(2);
    expect(found[0]).toContain('observatory, __proto__: unknown key');
    expect('polluted' in {}).toBe(false);
  });

  it.each([
    [
      'folder = "arrivals"',
      'folder = "."',
      ['holds the configuration file', 'holds the state folder', 'holds the models folder', 'holds the mail folder'],
    ],
    ['folder = "state"', 'folder = "arrivals/state"', ['holds the state folder']],
    ['folder = "mail"', 'folder = "arrivals"', ['is the same as the mail folder']],
    ['folder = "state"', 'folder = "."', ['lies in the state folder']],
    [
      '[models]',
      '[[feed]]\nname = "two"\nfolder = "arrivals/sub"\nlayout = "csv"\n[models]',
      ['lies in feed "nightly"'],
    ],
  ])('F-7 refuses overlapping folders: %s → %s', (from, to, expected) => {
    const found = complaints(changed(from, to)).filter((complaint) => complaint.includes(' error '));
    expect(found).toHaveLength(expected.length);
    for (const [index, words] of expected.entries()) expect(found[index]).toContain(words);
  });

  it('F-7 sees an overlap behind a link', () => {
    const folder = newFolder();
    mkdirSync(join(folder, 'arrivals'));
    symlinkSync(join(folder, 'arrivals'), join(folder, 'other'));
    expect(complaints(changed('folder = "state"', 'folder = "other/state"'), { folder })[0]).toContain(
      'holds the state folder',
    );
  });

  it('does not take folders with a like beginning for overlapping', () => {
    expect(complaints(changed('folder = "state"', 'folder = "arrivals-state"'))).toEqual([]);
    expect(complaints(changed('folder = "state"', 'folder = "..state"'))).toEqual([]);
  });

  it('F-8 refuses a state folder that anybody can write to', () => {
    const folder = newFolder();
    mkdirSync(join(folder, 'state'));
    chmodSync(join(folder, 'state'), 0o777);
    expect(complaints({}, { folder })).toEqual([
      "spinvigil.toml:5:1 error state, folder: anybody can write to state; run: chmod o-w 'state'",
    ]);
  });

  it('starts without a feed that is away, with a warning', () => {
    expect(complaints(changed('folder = "arrivals"', 'folder = "not mounted"'))).toEqual([
      'spinvigil.toml:12:1 warning feed 1, folder: not mounted does not exist or cannot be reached; the feed is silent until it can',
    ]);
  });

  it.each([
    [
      'itrf_m = [-2390490.0, 5564764.0, 1994727.0]',
      'itrf_m = [-2390.490, 5564.764, 1994.727]',
      "site 1, itrf_m: is 6.37652 km from the Earth's centre; a telescope is 6345 to 6395 km from it. ITRF coordinates in metres are wanted",
    ],
    [
      'itrf_m = [-2390490.0, 5564764.0, 1994727.0]',
      'itrf_m = [1, 2]',
      'site 1, itrf_m: must be three numbers: [x, y, z] in metres',
    ],
    [
      'name = "ridge"',
      'name = "barycentre"',
      'site 1, name: "barycentre" is what arrivals already at the barycentre say; it has no place on Earth',
    ],
    ['"clock/ridge.csv"', '"clock/none.csv"', 'site 1, clock_table: clock/none.csv does not exist'],
    ['layout = "csv"', 'layout = "columns"', 'feed 1, columns: is missing'],
    [
      'layout = "csv"',
      'layout = "CSV"',
      'feed 1, layout: must be one of "csv", "fits", "votable", "columns", found "CSV"',
    ],
    [
      'layout = "csv"',
      'layout = "fits"\n[feed.columns]\nseparator = "tab"',
      'feed 1, columns: belongs to layout = "columns"; this feed\'s layout is "fits"',
    ],
    [
      'layout = "csv"',
      'layout = "csv"\nexpect_every_hours = 0',
      'feed 1, expect_every_hours: must be between 0.01 and 100000 h, found 0',
    ],
    [
      'to = ["duty@kestrel.example"]',
      'to = ["a@b.example", "a@b.example"]',
      'mail, to 2: "a@b.example" stands there twice',
    ],
    [
      'to = ["duty@kestrel.example"]',
      'to = ["Duty <a@b.example>"]',
      'mail, to 1: must be a plain mail address such as duty@example.org',
    ],
    ['to = ["duty@kestrel.example"]', 'to = []', 'mail, to: must name at least one recipient'],
    [
      'from = "spinvigil@',
      'from = "x\\r\\nBcc: y@',
      'mail, from: must be a plain mail address such as duty@example.org',
    ],
    ['transport = "folder"', 'transport = "smtps"', 'mail, transport: must be one of "smtp", "folder", found "smtps"'],
    [
      'listen = "127.0.0.1:0"',
      'listen = "8417"',
      'review, listen: must be an address and a port such as "127.0.0.1:8417", found "8417"',
    ],
    ['[[feed]]', '[feed]', 'feed: must be written with double brackets: [[feed]]'],
  ])('refuses %s → %s', (from, to, message) => {
    expect(complaints(changed(from, to)).map((complaint) => complaint.replace(/^\S+ \w+ /, ''))).toContain(message);
  });

  it.each(['127.0.0.1:8417', '127.1.2.3:1', '[::1]:8417', 'localhost:0'])('listens on %s', (address) => {
    expect(complaints(changed('127.0.0.1:0', address))).toEqual([]);
  });
});

describe('mail by SMTP', () => {
  it('takes the usual port of the chosen security', () => {
    for (const [secure, port] of [
      ['tls', 465],
      ['starttls', 587],
    ] as const) {
      const files = smtp(`host = "mail.kestrel.example"\nsecure = "${secure}"`);
      const { configuration } = loadConfiguration(writeConfiguration(newFolder(), files));
      expect(configuration?.mail.transport).toEqual({
        kind: 'smtp',
        host: 'mail.kestrel.example',
        port,
        secure,
        user: null,
        passwordFile: null,
      });
    }
  });

  it('goes unencrypted to this machine alone', () => {
    expect(complaints(smtp('host = "127.0.0.1"\nsecure = "none"'))).toEqual([]);
    expect(complaints(smtp('host = "mail.example"\nsecure = "none"'))).toEqual([
      'spinvigil.toml:21:1 error mail, secure: "none" would send mail and password in the clear to mail.example; only a server on this machine may have it',
    ]);
  });

  it('F-1 refuses a password file that others can read, and never shows what is in it', () => {
    const folder = newFolder();
    const password = join(folder, 'password');
    const files = smtp('host = "mail.example"\nuser = "spin"\npassword_file = "password"');
    const load = () => complaints(files, { folder });
    expect(load()).toEqual(['spinvigil.toml:22:1 error mail, password_file: password does not exist']);
    writeFileSync(password, 'canary-4711\n', { mode: 0o644 });
    const [refusal] = load();
    expect(refusal).toBe(
      'spinvigil.toml:22:1 error mail, password_file: password can be read or written by others than its owner; run: chmod 600 password',
    );
    chmodSync(password, 0o600);
    const loaded = loadConfiguration(writeConfiguration(folder, files));
    expect(loaded.problems).toEqual([]);
    expect(JSON.stringify(loaded)).not.toContain('canary');
  });

  it('takes the password from the environment, and misses it', () => {
    const files = smtp('host = "mail.example"\nuser = "spin"');
    expect(complaints(files, { environment: { SPINVIGIL_MAIL_PASSWORD: 'x' } })).toEqual([]);
    expect(complaints(files)).toEqual([
      'spinvigil.toml:21:1 error mail, user: no password: set password_file in [mail] or the environment variable SPINVIGIL_MAIL_PASSWORD',
    ]);
  });

  it('refuses keys of the other transport', () => {
    expect(complaints(changed('folder = "mail"', 'folder = "mail"\nport = 25'))).toEqual([
      'spinvigil.toml:21:1 error mail, port: belongs to transport = "smtp"; this one is "folder"',
    ]);
  });
});

describe('the models folder', () => {
  it('must exist and hold a model', () => {
    expect(complaints({ models: {} })).toEqual([
      'models:null:null error there is no pulsar model here: one file a pulsar, its name ending in .toml',
    ]);
    const folder = newFolder();
    const file = writeConfiguration(folder);
    rmSync(join(folder, 'models'), { recursive: true });
    expect(loadConfiguration(file).problems).toMatchObject([{ message: 'the models folder cannot be read (ENOENT)' }]);
  });

  it('passes over hidden files and other endings', () => {
    expect(complaints({ models: { 'a.toml': PULSAR, '.b.toml': 'x', 'README.md': 'x', 'a.toml~': 'x' } })).toEqual([]);
  });

  it('holds one model a pulsar', () => {
    expect(complaints({ models: { 'a.toml': PULSAR, 'b.toml': PULSAR } })).toEqual([
      'b.toml:1:1 error name: "KR 0417+31" has a model already, in models/a.toml',
    ]);
  });
});
