import type { ReadonlySignal } from '@preact/signals';
import { useEffect, useId, useMemo, useRef } from 'preact/hooks';
import { CORNERS, type Build, type Corner } from '../../craft/build.ts';
import { useStore } from '../store/context.ts';

/** Order FL, FR, RL, RR. */
export interface CornerReading {
  /** Command as a share of the range from idle to full, 0 … 1. */
  readonly command: ArrayLike<number>;
  /** Above one half: the command stands at a limit. */
  readonly saturated: ArrayLike<number>;
}

const SIZE = 132;
const SPOKEN_EVERY_MS = 1000;

/**
 * A small plan of the craft, nose up, to the build's own proportions: each corner's disc fills with its command
 * and is hatched while saturated. Follows `reading` without rendering anew.
 */
export function CornerPlan(props: { build: Build; reading: ReadonlySignal<CornerReading> }) {
  const words = useStore().texts.plan;
  const svg = useRef<SVGSVGElement>(null);
  const id = useId();
  const plan = useMemo(() => layPlan(props.build), [props.build]);

  useEffect(() => {
    const root = svg.current;
    if (root === null) return;
    const fills = [...root.querySelectorAll('.corner-fill')];
    const hatches = [...root.querySelectorAll('.corner-hatch')];
    const texts = [...root.querySelectorAll('.corner-share')];
    let spoken_ms = -Infinity;
    return props.reading.subscribe(({ command, saturated }) => {
      for (let i = 0; i < 4; i++) {
        const { y, r } = plan.corners[i];
        const share = Math.min(1, Math.max(0, command[i]));
        fills[i].setAttribute('y', String(y + r - 2 * r * share));
        fills[i].setAttribute('height', String(2 * r * share));
        hatches[i].setAttribute('opacity', saturated[i] > 0.5 ? '1' : '0');
        const text = `${Math.round(share * 100)}`;
        if (texts[i].textContent !== text) texts[i].textContent = text;
      }
      const now_ms = performance.now();
      if (now_ms - spoken_ms < SPOKEN_EVERY_MS) return;
      spoken_ms = now_ms;
      const spoken = CORNERS.map((corner, i) => words.corner(corner, command[i], saturated[i] > 0.5));
      root.setAttribute('aria-label', `${words.label}: ${spoken.join('; ')}`);
    });
  }, [plan, props.reading]);

  return (
    <svg
      ref={svg}
      class="corner-plan"
      viewBox={`0 0 ${SIZE} ${SIZE}`}
      width={SIZE}
      height={SIZE}
      role="img"
      aria-label={words.label}
    >
      <defs>
        <pattern id={`${id}-hatch`} width="6" height="6" patternUnits="userSpaceOnUse">
          <path d="M-1 7 7 -1M-1 1 1 -1M5 7 7 5" stroke="var(--ink)" stroke-width="1" />
        </pattern>
        {plan.corners.map(({ corner, x, y, r }) => (
          <clipPath id={`${id}-${corner}`} key={corner}>
            <circle cx={x} cy={y} r={r} />
          </clipPath>
        ))}
      </defs>
      {plan.corners.map(({ corner, x, y }) => (
        <line key={corner} class="arm" x1={plan.centre.x} y1={plan.centre.y} x2={x} y2={y} />
      ))}
      <path class="nose" d={`M${plan.centre.x - 5} ${plan.centre.y - 6} l5 -9 l5 9z`} />
      {plan.corners.map(({ corner, x, y, r }) => (
        <g key={corner}>
          <circle class="disc" cx={x} cy={y} r={r} />
          <rect
            class="corner-fill"
            x={x - r}
            width={2 * r}
            y={y + r}
            height={0}
            clip-path={`url(#${id}-${corner})`}
          />
          <circle class="corner-hatch" cx={x} cy={y} r={r} fill={`url(#${id}-hatch)`} opacity="0" />
          <circle class="rim" cx={x} cy={y} r={r} />
          <text class="corner-name" x={x} y={y - 2}>
            {corner}
          </text>
          <text class="corner-share" x={x} y={y + 12} />
        </g>
      ))}
    </svg>
  );
}

interface Plan {
  readonly centre: { readonly x: number; readonly y: number };
  readonly corners: readonly { corner: Corner; x: number; y: number; r: number }[];
}

/** Body x (forward) to up, body y (right) to right, scaled so that all discs fit. */
function layPlan(build: Build): Plan {
  const r_m = build.propeller.diameter_m / 2;
  const reach = build.rotors.map((rotor) => rotor.position_m);
  const left = Math.min(...reach.map((p) => p[1])) - r_m;
  const right = Math.max(...reach.map((p) => p[1])) + r_m;
  const rear = Math.min(...reach.map((p) => p[0])) - r_m;
  const front = Math.max(...reach.map((p) => p[0])) + r_m;
  const scale = (SIZE - 4) / Math.max(right - left, front - rear);
  const place = (x_m: number, y_m: number) => ({
    x: SIZE / 2 + (y_m - (left + right) / 2) * scale,
    y: SIZE / 2 - (x_m - (front + rear) / 2) * scale,
  });
  const corners = CORNERS.flatMap((corner) => {
    const rotor = build.rotors.find((one) => one.corner === corner);
    return rotor === undefined
      ? []
      : [{ corner, ...place(rotor.position_m[0], rotor.position_m[1]), r: r_m * scale }];
  });
  return { centre: place(0, 0), corners };
}
