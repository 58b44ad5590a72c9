/**
 * Zoom, pan and values for the panels that the server drew (`charts/chart.ts`): it moves their marks and draws their axes anew.
 * All panels of an event share one axis of time. Keys: + − zoom, ← → pan, ↑ ↓ walk along the values, 0 or Home shows all again.
 * A wheel zooms a panel that has the focus, and never hinders scrolling past one that has not.
 */
export const CHART_SCRIPT = `
  const SVG = 'http://www.w3.org/2000/svg';
  const NEAR_PX = 28;
  const DEEPEST = 2000;
  const dateOf = (mjd) => new Date((mjd - 40587) * 86400000).toISOString().slice(0, 10);
  /** At 1, 2 or 5 times a power of ten, as the server places them. */
  const ticksAt = ([low, high], most) => {
    const rough = (high - low) / Math.max(1, most);
    const decade = 10 ** Math.floor(Math.log10(rough));
    const size = ([1, 2, 5, 10].find((m) => m * decade >= rough * (1 - 1e-9)) ?? 10) * decade;
    const decimals = Math.max(0, Math.min(15, -Math.floor(Math.log10(size) + 1e-9)));
    const values = [];
    for (let k = Math.ceil(low / size - 1e-9); k * size <= high + 1e-9 * size; k++) values.push(k * size);
    return { values, decimals };
  };
  const label = (value, decimals) => (value < 0 && Number(value.toFixed(decimals)) !== 0 ? '\u2212' : '') + Math.abs(value).toFixed(decimals);
  const make = (name, attributes, text) => {
    const element = document.createElementNS(SVG, name);
    for (const [key, value] of Object.entries(attributes)) element.setAttribute(key, value);
    if (text !== undefined) element.textContent = text;
    return element;
  };

  const chartOf = (svg) => {
    const data = JSON.parse(svg.dataset.chart);
    const find = (selector) => svg.querySelector(selector);
    const marks = [...svg.querySelectorAll('.point')];
    const says = marks.map((mark) => mark.querySelector('title').textContent);
    for (const mark of marks) mark.querySelector('title').remove();
    const height = Number(svg.getAttribute('viewBox').split(' ')[3]);
    const readout = svg.parentElement.querySelector('output');
    const chart = { svg, data, marks, says, height, readout, at: -1, width: 640 };
    svg.tabIndex = 0;
    svg.setAttribute('role', 'application');
    svg.setAttribute('aria-roledescription', 'plot');
    svg.setAttribute('aria-describedby', 'chart-keys');

    const scaleY = ([from, to]) => {
      const values = data.points.filter((p) => p[3] === 1 && p[0] >= from && p[0] <= to).flatMap((p) => [p[1] - p[2], p[1] + p[2]]);
      for (const [x, y] of data.curve) if (x >= from && x <= to) values.push(y);
      if (values.length === 0) return [-1, 1];
      const [low, high] = [Math.min(...values), Math.max(...values)];
      const room = (high - low || Math.abs(high) * 0.1 || 1) * data.air;
      return [low - room, high + room];
    };
    chart.draw = (domain) => {
      const { margin } = data;
      const width = Math.max(260, svg.getBoundingClientRect().width || 640);
      const [left, right, top, bottom] = [margin.left, width - margin.right, margin.top, height - margin.bottom];
      const vertical = scaleY(domain);
      const x = (v) => left + ((v - domain[0]) / (domain[1] - domain[0])) * (right - left);
      const y = (v) => bottom + ((v - vertical[0]) / (vertical[1] - vertical[0])) * (top - bottom);
      Object.assign(chart, { x, y, width, left, right });
      svg.setAttribute('viewBox', '0 0 ' + width + ' ' + height);
      for (const box of [find('.ground'), find('.ground-clip')]) box.setAttribute('width', right - left);
      const across = ticksAt(vertical, data.ticks[1]);
      const along = ticksAt(domain, Math.max(2, Math.min(data.ticks[0], Math.floor((right - left) / 105))));
      find('.axes').replaceChildren(
        ...across.values.flatMap((v) => [
          make('line', { class: 'grid', x1: left, x2: right, y1: y(v), y2: y(v) }),
          make('text', { x: left - 7, y: y(v) + 4, 'text-anchor': 'end' }, label(v, across.decimals)),
        ]),
        ...along.values.flatMap((v) => [
          make('line', { class: 'tick', x1: x(v), x2: x(v), y1: bottom, y2: bottom + 5 }),
          make('text', { x: x(v), y: bottom + 18, 'text-anchor': 'middle' }, label(v, along.decimals)),
          make('text', { class: 'date', x: x(v), y: bottom + 33, 'text-anchor': 'middle' }, dateOf(v)),
        ]),
      );
      const [low, best, high] = data.epoch;
      const wide = Math.max(2, x(high) - x(low));
      find('.epoch-band').setAttribute('x', (x(low) + x(high)) / 2 - wide / 2);
      find('.epoch-band').setAttribute('width', wide);
      for (const end of ['x1', 'x2']) find('.epoch-line').setAttribute(end, x(best));
      find('.curve').setAttribute('d', data.curve.map(([u, v], i) => (i === 0 ? 'M' : 'L') + x(u).toFixed(1) + ' ' + y(v).toFixed(1)).join(''));
      marks.forEach((mark, i) => {
        const [u, v, error] = data.points[i];
        mark.setAttribute('transform', 'translate(' + x(u).toFixed(1) + ' ' + y(v).toFixed(1) + ')');
        const half = Math.abs(y(error) - y(0));
        mark.querySelector('.error').setAttribute('y1', -half);
        mark.querySelector('.error').setAttribute('y2', half);
      });
    };
    chart.point = (i) => {
      marks[chart.at]?.classList.remove('chosen');
      chart.at = i;
      marks[i]?.classList.add('chosen');
      readout.textContent = says[i] ?? '';
    };
    return chart;
  };

  const chartsOf = (root) => {
    const group = root.matches?.('.charts') ? root : root.querySelector('.charts');
    if (group === null || group.querySelector('svg.chart') === null) return;
    const charts = [...group.querySelectorAll('svg.chart')].map(chartOf);
    const whole = charts[0].data.domain;
    let domain = whole;
    const show = (from, to) => {
      const span = Math.max((whole[1] - whole[0]) / DEEPEST, Math.min(whole[1] - whole[0], to - from));
      const start = Math.max(whole[0], Math.min(whole[1] - span, from));
      domain = [start, start + span];
      for (const chart of charts) chart.draw(domain);
    };
    const zoom = (factor, around = (domain[0] + domain[1]) / 2) => show(around - (around - domain[0]) * factor, around + (domain[1] - around) * factor);
    const pan = (share) => show(domain[0] + share * (domain[1] - domain[0]), domain[1] + share * (domain[1] - domain[0]));
    const ACTS = { in: () => zoom(0.5), out: () => zoom(2), earlier: () => pan(-0.25), later: () => pan(0.25), all: () => show(...whole) };
    const bar = group.querySelector('.chart-bar');
    bar.hidden = false;
    for (const button of bar.querySelectorAll('button')) button.addEventListener('click', ACTS[button.dataset.act]);

    for (const chart of charts) {
      const { svg, data } = chart;
      const walk = (direction) => {
        const next = chart.at < 0 ? data.points.findIndex((p) => p[0] >= domain[0]) : chart.at + direction;
        if (next < 0 || next >= data.points.length) return;
        const mjd = data.points[next][0];
        if (mjd < domain[0] || mjd > domain[1]) show(mjd - (domain[1] - domain[0]) / 2, mjd + (domain[1] - domain[0]) / 2);
        chart.point(next);
      };
      const around = () => (chart.at < 0 ? undefined : Math.min(domain[1], Math.max(domain[0], data.points[chart.at][0])));
      const keys = { '+': () => zoom(0.5, around()), '=': () => zoom(0.5, around()), '-': () => zoom(2, around()), ArrowLeft: ACTS.earlier, ArrowRight: ACTS.later, ArrowDown: () => walk(1), ArrowUp: () => walk(-1), 0: ACTS.all, Home: ACTS.all };
      svg.addEventListener('keydown', (key) => {
        const act = keys[key.key];
        if (act === undefined || key.ctrlKey || key.altKey || key.metaKey) return;
        key.preventDefault();
        act();
      });
      const pointed = (event) => {
        const box = svg.getBoundingClientRect();
        return [((event.clientX - box.left) / box.width) * chart.width, ((event.clientY - box.top) / box.height) * chart.height];
      };
      const mjdAt = (px) => domain[0] + ((px - chart.left) / (chart.right - chart.left)) * (domain[1] - domain[0]);
      svg.addEventListener('wheel', (wheel) => {
        if (document.activeElement !== svg) return;
        wheel.preventDefault();
        zoom(wheel.deltaY > 0 ? 1.25 : 0.8, mjdAt(pointed(wheel)[0]));
      }, { passive: false });
      let grip = null;
      svg.addEventListener('pointerdown', (down) => {
        if (down.button !== 0) return;
        grip = { at: pointed(down)[0], domain };
        svg.setPointerCapture(down.pointerId);
      });
      svg.addEventListener('pointermove', (move) => {
        const [px, py] = pointed(move);
        if (grip !== null) {
          const shift = ((grip.at - px) / (chart.right - chart.left)) * (grip.domain[1] - grip.domain[0]);
          show(grip.domain[0] + shift, grip.domain[1] + shift);
          return;
        }
        const away = data.points.map((p) => (p[0] < domain[0] || p[0] > domain[1] ? Infinity : Math.hypot(chart.x(p[0]) - px, chart.y(p[1]) - py)));
        const nearest = away.indexOf(Math.min(...away));
        if (away[nearest] < NEAR_PX) chart.point(nearest);
      });
      for (const end of ['pointerup', 'pointercancel']) svg.addEventListener(end, () => (grip = null));
      svg.addEventListener('dblclick', ACTS.all);
    }
    charts[0].readout.textContent = 'Point at a mark, or press ↓ in a plot, for its value.';
    show(...whole);
    new ResizeObserver(() => show(...domain)).observe(group);
    addEventListener('beforeprint', () => show(...whole));
  };
  chartsOf(document);
  arrivals.push(chartsOf);
`;
