// Seconds to what people read. Mirrors model/calendar.py; a test compares the two.

const DAY = 86400, HOUR = 3600;
const DAYS = ["Sun", "Mon", "Tue", "Wed", "Thu", "Fri", "Sat"];
const MONTHS = ["Jan", "Feb", "Mar", "Apr", "May", "Jun", "Jul", "Aug", "Sep", "Oct", "Nov", "Dec"];

const onTheWall = given.start !== null;
// Wall time is kept as if it were universal time, so that the reader's own time zone plays no part.
const startOfClock = onTheWall ? Date.parse(`${given.start}Z`) / 1000 : 0;

function offsetAt(seconds) {
  let offset = 0;
  for (const [from, ahead] of given.clock_changes) if (seconds >= from) offset = ahead;
  return offset;
}

// Seconds of wall time, counted from the year 1970; only differences and dates of it mean anything.
function wall(seconds) {
  return startOfClock + seconds + offsetAt(seconds);
}

function two(number) {
  return String(number).padStart(2, "0");
}

function elapsed(seconds) {
  const whole = Math.round(Math.abs(seconds)), minutes = Math.floor(whole / 60), rest = whole % 60;
  const text = `${Math.floor(minutes / 60)}:${two(minutes % 60)}`;
  return (seconds < 0 && whole ? "-" : "") + (rest ? `${text}:${two(rest)}` : text);
}

function timeOfDay(moment) {
  const of = Math.round(moment) - Math.floor(Math.round(moment) / DAY) * DAY;
  const text = `${two(Math.floor(of / HOUR))}:${two(Math.floor((of % HOUR) / 60))}`;
  return of % 60 ? `${text}:${two(of % 60)}` : text;
}

function dayName(moment) {
  const date = new Date(moment * 1000);
  return `${DAYS[date.getUTCDay()]} ${date.getUTCDate()} ${MONTHS[date.getUTCMonth()]}`;
}

// `13:30`, `Tue 01:15` on another day, `2026-03-12 01:15` a week away, or elapsed `7:30`.
function say(seconds) {
  if (!onTheWall) return elapsed(seconds);
  const moment = wall(Math.round(seconds));
  const days = Math.floor(moment / DAY) - Math.floor(startOfClock / DAY);
  if (days === 0) return timeOfDay(moment);
  const date = new Date(moment * 1000);
  const day = Math.abs(days) < 7 ? DAYS[date.getUTCDay()] : date.toISOString().slice(0, 10);
  return `${day} ${timeOfDay(moment)}`;
}

function span(from, to) {
  return `${say(from)} – ${say(to)}`;
}

// `7 h 30`, `2 h`, `45 min`, `12 min 30 s`, `90 s` is `1 min 30 s`.
function duration(seconds) {
  const hours = Math.floor(seconds / HOUR), minutes = Math.floor((seconds % HOUR) / 60), odd = seconds % 60;
  if (hours) {
    const text = minutes ? `${hours} h ${two(minutes)}` : `${hours} h`;
    return odd ? `${text} min ${odd} s` : text;
  }
  if (minutes) return odd ? `${minutes} min ${odd} s` : `${minutes} min`;
  return `${odd} s`;
}

// ---- the time axis ------------------------------------------------------------------------------

const STEPS = [
  1, 5, 10, 30, 60, 120, 300, 600, 900, 1800, HOUR, 2 * HOUR, 3 * HOUR, 6 * HOUR, 12 * HOUR,
  DAY, 2 * DAY, 7 * DAY, 14 * DAY, 28 * DAY, 91 * DAY, 364 * DAY,
];

// Round times of the wall clock between two moments, at most one in `apart` seconds.
function ticks(from, to, apart) {
  const step = STEPS.find((size) => size >= apart) ?? STEPS[STEPS.length - 1];
  const found = [];
  const changes = given.clock_changes;
  for (let i = 0; i < changes.length; i++) {
    const begin = Math.max(from, i ? changes[i][0] : -Infinity);
    const end = Math.min(to, i + 1 < changes.length ? changes[i + 1][0] - 1 : Infinity);
    const ahead = (onTheWall ? startOfClock : 0) + changes[i][1];
    for (let moment = Math.ceil((begin + ahead) / step) * step; moment - ahead <= end; moment += step) {
      found.push({ at: moment - ahead, text: tickText(moment, step) });
    }
  }
  return found;
}

function tickText(moment, step) {
  if (!onTheWall) return elapsed(moment);
  return moment % DAY === 0 || step >= DAY ? dayName(moment) : timeOfDay(moment);
}

// The value that plotly's axis has for a time: milliseconds on a date axis, seconds on a plain one.
function onAxis(seconds) {
  return onTheWall ? (startOfClock + seconds) * 1000 : seconds;
}
