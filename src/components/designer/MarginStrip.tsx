import type { KeyboardEvent, PointerEvent } from 'react';
import { useEffect, useId, useLayoutEffect, useMemo, useRef, useState } from 'react';

import type { CorrelationModel } from '#core/correlation/model.ts';
import { bufferForTolerance } from '#core/correlation/boundary-effect.ts';
import { axisTicks, bufferStep, effectCurve, elementTicks, powerTicks, roundBuffer } from '#client/design/margin-scale.ts';
import { formatKm, formatPercent } from '#client/design/words.ts';

interface MarginStripProps {
  model: CorrelationModel;
  bufferKm: number;
  coreSpacingKm: number;
  growth: number;
  corners: 'round' | 'square';
  /** Sharpest change of direction of the outline, radians. */
  turning: number;
  /** Largest predicted effect in force over all observations. */
  worst: number | null;
  sentence: string;
  isReadOnly: boolean;
  onBuffer(km: number, gesture: string): void;
  onDone(): void;
}

const HEIGHT = 190;
const TOP = 14;
const FLOOR = 136;
const BAND = 24;
const LEFT = 50;
const RIGHT = 14;
const MOST_KM = 20_000;

/** The cross-section from the outermost observation to the boundary, to scale; the boundary is a handle. */
export const MarginStrip = (props: MarginStripProps) => {
  const { model, bufferKm, coreSpacingKm, growth, corners, turning, worst, sentence, isReadOnly, onBuffer, onDone } = props;
  const id = useId();
  const svg = useRef<SVGSVGElement>(null);
  const [width, setWidth] = useState(900);
  const [isDragging, setIsDragging] = useState(false);
  const [endKm, setEndKm] = useState(0);

  useLayoutEffect(() => {
    const element = svg.current?.parentElement;
    if (!element) return;
    const observer = new ResizeObserver(() => setWidth(Math.max(300, element.clientWidth)));
    observer.observe(element);
    setWidth(Math.max(300, element.clientWidth));
    return () => observer.disconnect();
  }, []);

  const needed = useMemo(() => ({ straight: bufferForTolerance(model), corner: turning > 0 ? bufferForTolerance(model, turning) : null }), [model, turning]);
  useEffect(() => {
    // the scale stands still under the pointer, and gives way only at its ends
    const wanted = 1.45 * Math.max(bufferKm, needed.corner ?? needed.straight, 1e-3);
    setEndKm((end) => (end > 0 && (isDragging ? bufferKm < 0.99 * end : bufferKm < 0.86 * end && wanted > 0.4 * end && (needed.corner ?? needed.straight) < 0.95 * end) ? end : wanted));
  }, [bufferKm, needed, isDragging]);

  const end = endKm || 1.45 * Math.max(bufferKm, needed.straight);
  const core = Math.min(72, 0.12 * width);
  const zero = LEFT + core;
  const scale = (width - RIGHT - zero) / end;
  const xOf = (km: number): number => zero + km * scale;
  const curve = useMemo(() => effectCurve(model, corners === 'round' ? turning : 0, end / 200, end, 80), [model, turning, corners, end]);
  const low = 10 ** Math.floor(Math.log10(Math.min(model.tolerance / 8, 0.9 * (worst || 1), model.tolerance)));
  const yOf = (share: number): number => {
    const t = (Math.log10(Math.max(share, low / 100)) - Math.log10(low)) / (Math.log10(2) - Math.log10(low));
    return FLOOR - 8 - Math.min(1, t) * (FLOOR - 8 - TOP);
  };
  const path = (values: number[]): string => values.map((value, k) => `${k === 0 ? 'M' : 'L'}${xOf(curve.at[k]).toFixed(1)} ${yOf(value).toFixed(1)}`).join('');
  const ticks = useMemo(() => elementTicks(bufferKm, coreSpacingKm, growth), [bufferKm, coreSpacingKm, growth]);
  const boundary = xOf(Math.min(bufferKm, end));
  const isOver = worst !== null && worst > model.tolerance;

  const fromPointer = (event: PointerEvent): number => {
    const box = svg.current!.getBoundingClientRect();
    const km = ((event.clientX - box.left) * (width / box.width) - zero) / scale;
    return Math.min(MOST_KM, Math.max(roundBuffer(end / 400), roundBuffer(Math.max(km, 1e-3))));
  };
  const handleDown = (event: PointerEvent): void => {
    if (isReadOnly || event.button !== 0) return;
    svg.current!.setPointerCapture(event.pointerId);
    setIsDragging(true);
    onBuffer(fromPointer(event), 'boundary');
  };
  const handleMove = (event: PointerEvent): void => {
    if (isDragging) onBuffer(fromPointer(event), 'boundary');
  };
  const handleUp = (): void => {
    if (!isDragging) return;
    setIsDragging(false);
    onDone();
  };
  const handleKey = (event: KeyboardEvent): void => {
    const step = bufferStep(bufferKm);
    const moves: Record<string, number> = { ArrowRight: step, ArrowUp: step, ArrowLeft: -step, ArrowDown: -step, PageUp: 10 * step, PageDown: -10 * step };
    let next: number | undefined;
    if (event.key in moves) next = bufferKm + moves[event.key];
    else if (event.key === 'Home') next = needed.straight;
    else if (event.key === 'End') next = needed.corner ?? needed.straight;
    if (next === undefined || isReadOnly || event.ctrlKey || event.metaKey) return;
    event.preventDefault();
    onBuffer(Math.min(MOST_KM, roundBuffer(Math.max(step / 10, next))), 'boundary-keys');
  };

  return (
    <section aria-label="Margin strip" className="border-t border-line-strong bg-linen px-0 pt-2">
      <p className="px-4 font-mono text-sm text-ink" data-testid="margin-sentence">
        <span aria-hidden="true" className={isOver ? 'text-madder' : 'text-lichen'}>{worst === null ? '' : isOver ? '✕ ' : '✓ '}</span>
        {sentence}
      </p>
      <div className="relative">
        <svg
          ref={svg}
          width={width}
          height={HEIGHT}
          viewBox={`0 0 ${width} ${HEIGHT}`}
          className={`block touch-pan-y select-none ${isReadOnly ? '' : 'cursor-ew-resize'}`}
          onPointerDown={handleDown}
          onPointerMove={handleMove}
          onPointerUp={handleUp}
          onPointerCancel={handleUp}
        >
          <defs>
            <Weave id={`${id}-core`} warp="var(--woad)" ground="var(--woad-wash)" />
            <Weave id={`${id}-buffer`} warp="var(--weld)" ground="var(--weld-wash)" />
            <clipPath id={`${id}-plot`}>
              <rect x={zero} y={0} width={Math.max(0, width - RIGHT - zero)} height={FLOOR} />
            </clipPath>
          </defs>

          {powerTicks(low, 1).map((share) => (
            <g key={share}>
              <line x1={zero} x2={width - RIGHT} y1={yOf(share)} y2={yOf(share)} stroke="var(--line)" />
              <text x={LEFT - 6} y={yOf(share) + 4} textAnchor="end" className="fill-ink-soft font-mono text-[11px]">{formatPercent(share)}</text>
            </g>
          ))}
          <rect x={zero} y={TOP - 6} width={Math.max(0, boundary - zero)} height={FLOOR - TOP + 6} fill="var(--weld-wash)" opacity={0.45} />
          <rect x={LEFT} y={TOP - 6} width={core} height={FLOOR - TOP + 6} fill="var(--woad-wash)" opacity={0.55} />

          <line x1={LEFT} x2={width - RIGHT} y1={yOf(model.tolerance)} y2={yOf(model.tolerance)} stroke="var(--madder)" strokeDasharray="2 4" strokeWidth={1.5} />
          <text x={width - RIGHT - 2} y={yOf(model.tolerance) - 5} textAnchor="end" className="fill-madder font-mono text-[11px]">
            limit {formatPercent(model.tolerance)}
          </text>
          <g clipPath={`url(#${id}-plot)`} fill="none" strokeWidth={2}>
            <path d={path(curve.straight)} stroke="var(--woad)" />
            {curve.corner.length > 0 && <path d={path(curve.corner)} stroke="var(--walnut)" strokeDasharray="7 4" />}
          </g>
          <Needed at={xOf(needed.straight)} y={yOf(model.tolerance)} isInside={needed.straight < end} colour="var(--woad)" />
          {needed.corner !== null && corners === 'round' && <Needed at={xOf(needed.corner)} y={yOf(model.tolerance)} isInside={needed.corner < end} colour="var(--walnut)" />}
          {worst !== null && (
            <g data-testid="margin-worst">
              <circle cx={boundary} cy={Math.min(yOf(worst), FLOOR - 6)} r={5.5} fill="var(--linen-raised)" stroke="var(--madder)" strokeWidth={2.5} />
            </g>
          )}

          <rect x={LEFT} y={FLOOR} width={core} height={BAND} fill={`url(#${id}-core)`} />
          <rect x={zero} y={FLOOR} width={Math.max(0, boundary - zero)} height={BAND} fill={`url(#${id}-buffer)`} />
          {ticks.map((km) => (
            <line key={km} x1={xOf(km)} x2={xOf(km)} y1={FLOOR + 3} y2={FLOOR + BAND - 3} stroke="var(--ink)" strokeWidth={1.25} />
          ))}
          <Fringe from={boundary} to={width - RIGHT} />
          <circle cx={zero} cy={FLOOR} r={4.5} fill="var(--woad)" stroke="var(--linen-raised)" strokeWidth={1.5} />

          {axisTicks(end, Math.max(3, Math.floor((width - zero) / 92))).map((km) => (
            <g key={km}>
              <line x1={xOf(km)} x2={xOf(km)} y1={FLOOR + BAND} y2={FLOOR + BAND + 5} stroke="var(--line-strong)" />
              <text x={xOf(km)} y={FLOOR + BAND + 18} textAnchor="middle" className="fill-ink-soft font-mono text-[11px] tabular-nums">{km.toLocaleString('en-GB')}</text>
            </g>
          ))}
          <text x={LEFT} y={FLOOR + BAND + 18} className="fill-ink-soft font-mono text-[11px]">km</text>
        </svg>

        <div
          role="slider"
          tabIndex={0}
          aria-label="Boundary: buffer distance"
          aria-valuemin={0}
          aria-valuemax={MOST_KM}
          aria-valuenow={bufferKm}
          aria-valuetext={sentence}
          aria-disabled={isReadOnly}
          aria-orientation="horizontal"
          data-testid="boundary-handle"
          onKeyDown={handleKey}
          onKeyUp={onDone}
          onPointerDown={(event) => {
            event.currentTarget.focus();
            handleDown(event);
          }}
          className="group absolute top-1 -ml-3.5 w-7 cursor-ew-resize touch-none outline-none"
          style={{ left: boundary, height: FLOOR + BAND + 2 }}
        >
          <span className="absolute inset-y-0 left-1/2 w-[5px] -translate-x-1/2 border-x-2 border-madder" />
          <span className="absolute bottom-0 left-1/2 flex h-[34px] w-[18px] -translate-x-1/2 flex-col items-center justify-center gap-[3px] border-2 border-madder bg-linen-raised group-focus-visible:outline-3 group-focus-visible:outline-offset-2 group-focus-visible:outline-woad">
            <span className="h-px w-2 bg-madder" />
            <span className="h-px w-2 bg-madder" />
            <span className="h-px w-2 bg-madder" />
          </span>
        </div>
      </div>
      <Key corners={corners} turning={turning} needed={needed} elements={ticks.length + 1} />
    </section>
  );
};

/** Plain weave: warp and weft cross over and under. */
const Weave = ({ id, warp, ground }: { id: string; warp: string; ground: string }) => (
  <pattern id={id} width={8} height={8} patternUnits="userSpaceOnUse">
    <rect width={8} height={8} fill={ground} />
    <g fill={warp} opacity={0.34}>
      <rect x={0.5} y={0.5} width={3} height={3} />
      <rect x={4.5} y={4.5} width={3} height={3} />
    </g>
    <g fill={warp} opacity={0.16}>
      <rect x={4.5} y={0.5} width={3} height={3} />
      <rect x={0.5} y={4.5} width={3} height={3} />
    </g>
  </pattern>
);

/** Loose warp threads beyond the selvage. */
const Fringe = ({ from, to }: { from: number; to: number }) => (
  <g stroke="var(--line-strong)" strokeWidth={1} opacity={0.55}>
    {[5, 10, 15, 20].map((dy, k) => (
      <line key={dy} x1={from + 4} x2={Math.max(from + 4, Math.min(to, from + 30 + 9 * ((k * 7) % 4)))} y1={FLOOR + dy} y2={FLOOR + dy} />
    ))}
  </g>
);

const Needed = ({ at, y, isInside, colour }: { at: number; y: number; isInside: boolean; colour: string }) =>
  isInside ? <path d={`M${at - 5} ${y - 6}h10l-5 6z`} fill={colour} /> : null;

interface KeyProps {
  corners: 'round' | 'square';
  turning: number;
  needed: { straight: number; corner: number | null };
  elements: number;
}

const Key = ({ corners, turning, needed, elements }: KeyProps) => (
  <ul className="flex flex-wrap gap-x-6 gap-y-0.5 px-4 pb-2.5 font-mono text-xs text-ink">
    <li className="flex items-center gap-2">
      <span aria-hidden="true" className="w-6 border-t-2 border-woad" />
      straight side: limit met from {formatKm(needed.straight)}
    </li>
    {corners === 'round' && needed.corner !== null && (
      <li className="flex items-center gap-2">
        <span aria-hidden="true" className="w-6 border-t-2 border-dashed border-walnut" />
        worst rounded corner ({Math.round((turning * 180) / Math.PI)}°): from {formatKm(needed.corner)}
      </li>
    )}
    <li className="flex items-center gap-2">
      <span aria-hidden="true" className="size-3 rounded-full border-2 border-madder" />
      worst observation of this mesh
    </li>
    <li className="flex items-center gap-2">
      <span aria-hidden="true">|||</span>
      about {elements} elements across the buffer
    </li>
  </ul>
);
