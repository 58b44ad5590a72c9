import type { PulsarModel } from '../../detectors/spin/pulsarModel.ts';
import type { PulsarEvent } from '../../detectors/steps/pulsarEvent.ts';
import { type Markup, markup } from '../markup.ts';
import { domainOf } from '../messageId.ts';
import { dateOfMjd } from '../wording/dates.ts';
import { DRILL_TEXT, eventName, explanationName, meaningOf } from '../wording/phrases.ts';
import { whatParams } from './whatParams.ts';

/**
 * The event as a VOEvent 2.0 packet (IVOA Recommendation of 11 July 2011, "Sky Event Reporting Metadata"): what was measured under What
 * and WhereWhen, what it may mean under Why, what it replaces under Citations.
 */
export interface NoticeContext {
  readonly observatory: { readonly name: string; readonly contact: string };
  /** Null: without position and spin. */
  readonly model: PulsarModel | null;
  readonly revision: number;
  readonly issuedAt: Date;
  /** The revision that this one supersedes or retracts; null: the first notice. */
  readonly cites: number | null;
  /** A rehearsal: the packet says `role="test"`. */
  readonly drill: boolean;
}

export function voevent(event: PulsarEvent, context: NoticeContext): string {
  return `<?xml version="1.0" encoding="UTF-8"?>\n${packet(event, context).source}`;
}

function packet(event: PulsarEvent, context: NoticeContext): Markup {
  const { contact, name } = context.observatory;
  return markup`<voe:VOEvent xmlns:voe="http://www.ivoa.net/xml/VOEvent/v2.0" xmlns:xsi="http://www.w3.org/2001/XMLSchema-instance" xsi:schemaLocation="http://www.ivoa.net/xml/VOEvent/v2.0 http://www.ivoa.net/xml/VOEvent/VOEvent-v2.0.xsd" version="2.0" role="${context.drill ? 'test' : 'observation'}" ivorn="${identifier(event, contact, context.revision)}">
  <Who>
    <AuthorIVORN>ivo://${domainOf(contact)}/spinvigil</AuthorIVORN>
    <Date>${context.issuedAt.toISOString().slice(0, 19)}</Date>
    <Author>
      <title>${name}</title>
      <contactEmail>${contact}</contactEmail>
    </Author>
  </Who>
  <What>
${whatParams(event, context.model, context.revision).map((p) => markup`    ${p}\n`)}  </What>
  <WhereWhen>
    <ObsDataLocation>
      <ObservatoryLocation id="SOLAR_SYSTEM_BARYCENTER"/>
      <ObservationLocation>
        <AstroCoordSystem id="TDB-ICRS-BARY"/>
        <AstroCoords coord_system_id="TDB-ICRS-BARY">
          <Time unit="s">
            <TimeInstant>
              <ISOTime>${dateOfMjd(event.epochMjd).toISOString().slice(0, 19)}</ISOTime>
            </TimeInstant>
            <Error>${rounded(((event.epochInterval68[1] - event.epochInterval68[0]) / 2) * 86_400, 3)}</Error>
          </Time>
${position(event, context.model)}        </AstroCoords>
      </ObservationLocation>
    </ObsDataLocation>
  </WhereWhen>
  <How>
    <Description>Step in the spin of a pulsar found from its pulse arrival times, brought to the solar-system barycentre (TDB), by comparing explanations; intervals hold 68 % probability.</Description>
  </How>
${why(event)}${citations(event, context)}  <Description>${description(event, context.drill)}</Description>
</voe:VOEvent>
`;
}

/** One packet for each revision. */
function identifier(event: PulsarEvent, contact: string, revision: number): string {
  return `ivo://${domainOf(contact)}/spinvigil#${event.id.replace(/[^A-Za-z0-9._+-]+/g, '_')}-r${revision}`;
}

function description(event: PulsarEvent, drill: boolean): string {
  const vetted =
    event.state === 'accepted'
      ? 'Accepted by a reviewer.'
      : 'Found by a program and not yet accepted by a reviewer: to be vetted before it is announced.';
  const rehearsal = drill ? `${DRILL_TEXT} ` : '';
  return `${rehearsal}${event.pulsar}: ${eventName(event)}. ${meaningOf(event)} ${vetted}`;
}

function position(event: PulsarEvent, model: PulsarModel | null): Markup | null {
  if (model === null || event.site !== null) return null;
  return markup`          <Position2D unit="deg">
            <Name1>RA</Name1>
            <Name2>Dec</Name2>
            <Value2>
              <C1>${degrees(model.rightAscensionRad)}</C1>
              <C2>${degrees(model.declinationRad)}</C2>
            </Value2>
            <Error2Radius>0</Error2Radius>
          </Position2D>
`;
}

/** Hypotheses stand apart from measurements, each with its probability. */
function why(event: PulsarEvent): Markup {
  const ranked = Object.entries(event.explanations)
    .filter(([, p]) => p >= 1e-6)
    .toSorted((a, b) => b[1] - a[1]);
  const inferences = ranked.map(
    ([name, p]) => markup`    <Inference probability="${rounded(p, 6)}">
      <Name>${event.site ?? event.pulsar}</Name>
      <Concept>${explanationName(name)}</Concept>
    </Inference>
`,
  );
  return markup`  <Why>
${inferences}  </Why>
`;
}

function citations(event: PulsarEvent, { cites, observatory }: NoticeContext): Markup | null {
  if (cites === null) return null;
  const cite = event.state === 'withdrawn' || event.state === 'rejected' ? 'retraction' : 'supersedes';
  return markup`  <Citations>
    <EventIVORN cite="${cite}">${identifier(event, observatory.contact, cites)}</EventIVORN>
  </Citations>
`;
}

function degrees(radians: number): number {
  return rounded((radians * 180) / Math.PI, 8);
}

function rounded(value: number, decimals: number): number {
  return Number(value.toFixed(decimals));
}
