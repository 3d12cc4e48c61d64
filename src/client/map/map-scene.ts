import * as THREE from 'three';
import { LineMaterial } from 'three/examples/jsm/lines/LineMaterial.js';
import { LineSegments2 } from 'three/examples/jsm/lines/LineSegments2.js';
import { LineSegmentsGeometry } from 'three/examples/jsm/lines/LineSegmentsGeometry.js';

import { SCALE_STEPS } from './colour-scale.ts';
import type { MeshBuffers } from './mesh-buffers.ts';
import type { ThemeColours } from './theme-colours.ts';

/** Points with a share of the colour scale each (0 to 1; above 1 beyond the limit; negative: plain). */
export interface PointBuffers {
  /** 2 per point, map kilometres. */
  positions: Float32Array;
  share: Float32Array | null;
}

/** Cells filled by a share of the colour scale; cell i has corners start[i] .. start[i + 1] - 1. */
export interface CellBuffers {
  start: Uint32Array;
  positions: Float32Array;
  share: Float32Array;
}

export interface LayerChoice {
  elements: boolean;
  observations: boolean;
  spacing: boolean;
  effect: boolean;
  land: boolean;
}

/** Triangles (2 coordinates per corner, 3 corners each) and shore lines (x1 y1 x2 y2 each) of land. */
export interface LandBuffers {
  triangles: Float32Array;
  shore: Float32Array;
}

export interface MapScene {
  group: THREE.Group;
  setMesh(mesh: MeshBuffers | null): void;
  setPoints(points: PointBuffers | null): void;
  setCells(cells: CellBuffers | null): void;
  setLand(land: LandBuffers | null): void;
  /** The observation with the largest effect, map kilometres. */
  setLimiting(position: [number, number] | null): void;
  /** The place shown on request: elements by their 6 coordinates each, points by 2. */
  setPlace(place: { triangles: Float32Array; points: Float32Array } | null): void;
  /** The node under pointer or keyboard. */
  setCursor(position: [number, number] | null): void;
  setLayers(layers: LayerChoice): void;
  setTheme(colours: ThemeColours): void;
  /** Fades the edges where elements get smaller than a few pixels; `zoom` in pixels per map kilometre. */
  setZoom(zoom: number, pixelRatio: number): void;
  destroy(): void;
}

const POINT_VERTEX = `
attribute float share;
uniform float size;
varying float vShare;
void main() {
  vShare = share;
  gl_Position = projectionMatrix * modelViewMatrix * vec4(position, 1.0);
  gl_PointSize = share > 1.0 ? size * 1.45 : size;
}`;

const POINT_FRAGMENT = `
uniform sampler2D scale;
uniform vec3 plain;
uniform vec3 rim;
uniform vec3 beyond;
uniform float size;
varying float vShare;
void main() {
  float full = vShare > 1.0 ? size * 1.45 : size;
  float r = length(gl_PointCoord - 0.5) * full;
  float edge = full * 0.5 - 0.5;
  float cover = 1.0 - smoothstep(edge - 0.6, edge + 0.6, r);
  if (cover <= 0.0) discard;
  vec3 fill = vShare < 0.0 ? plain : texture2D(scale, vec2(min(vShare, 1.0) * 0.984 + 0.008, 0.5)).rgb;
  float width = vShare > 1.0 ? size * 0.26 : max(1.0, size * 0.14);
  float isRim = smoothstep(edge - width - 0.5, edge - width + 0.5, r);
  gl_FragColor = vec4(mix(fill, vShare > 1.0 ? beyond : rim, isRim), cover);
}`;

const CELL_VERTEX = `
attribute float share;
varying float vShare;
void main() {
  vShare = share;
  gl_Position = projectionMatrix * modelViewMatrix * vec4(position, 1.0);
}`;

const CELL_FRAGMENT = `
uniform sampler2D scale;
varying float vShare;
void main() {
  gl_FragColor = vec4(texture2D(scale, vec2(clamp(vShare, 0.0, 1.0) * 0.984 + 0.008, 0.5)).rgb, 0.85);
}`;

const RING_FRAGMENT = `
uniform vec3 plain;
uniform vec3 rim;
uniform float size;
void main() {
  float r = length(gl_PointCoord - 0.5) * size;
  float middle = size * 0.36;
  float band = abs(r - middle);
  float halo = 1.0 - smoothstep(size * 0.105, size * 0.105 + 1.0, band);
  float line = 1.0 - smoothstep(size * 0.055, size * 0.055 + 1.0, band);
  if (halo <= 0.0) discard;
  gl_FragColor = vec4(mix(rim, plain, line), halo);
}`;

/** Third coordinates of 0 for pairs. */
const lift = (pairs: Float32Array): Float32Array => {
  const out = new Float32Array((pairs.length / 2) * 3);
  for (let i = 0, k = 0; i < pairs.length; i += 2, k += 3) {
    out[k] = pairs[i];
    out[k + 1] = pairs[i + 1];
  }
  return out;
};

/** Everything drawn on a map, bottom to top; setters upload geometry, `setZoom` and `setTheme` only uniforms. */
export const createMapScene = (requestFrame: () => void): MapScene => {
  const group = new THREE.Group();
  const scaleTexture = new THREE.DataTexture(new Uint8Array(4 * SCALE_STEPS), SCALE_STEPS, 1);
  scaleTexture.minFilter = scaleTexture.magFilter = THREE.LinearFilter;

  const flat = (opacity = 1): THREE.MeshBasicMaterial =>
    new THREE.MeshBasicMaterial({ transparent: opacity < 1, opacity, depthTest: false, depthWrite: false, side: THREE.DoubleSide });
  const thin = (opacity = 1): THREE.LineBasicMaterial => new THREE.LineBasicMaterial({ transparent: opacity < 1, opacity, depthTest: false, depthWrite: false });
  const thick = (width: number, dashed = false): LineMaterial =>
    new LineMaterial({ linewidth: width, depthTest: false, depthWrite: false, dashed, transparent: true, ...(dashed && { dashSize: 1, gapSize: 1 }) });
  const shader = (vertexShader: string, fragmentShader: string): THREE.ShaderMaterial =>
    new THREE.ShaderMaterial({
      vertexShader,
      fragmentShader,
      transparent: true,
      depthTest: false,
      depthWrite: false,
      side: THREE.DoubleSide,
      uniforms: { scale: { value: scaleTexture }, plain: { value: new THREE.Color() }, rim: { value: new THREE.Color() }, beyond: { value: new THREE.Color() }, size: { value: 7 } },
    });

  const landMaterial = flat(0.999);
  const shoreMaterial = thin(0.7);
  const coreMaterial = flat(0.82);
  const bufferMaterial = flat(0.82);
  const cellMaterial = shader(CELL_VERTEX, CELL_FRAGMENT);
  const edgeMaterial = thin(0.5);
  const placeMaterial = flat(0.75);
  const outlineMaterial = thick(1.6);
  const boundaryMaterial = thick(3);
  const pointMaterial = shader(POINT_VERTEX, POINT_FRAGMENT);
  const limitMaterial = shader(POINT_VERTEX, RING_FRAGMENT);
  const placePointMaterial = shader(POINT_VERTEX, RING_FRAGMENT);
  const cursorMaterial = shader(POINT_VERTEX, RING_FRAGMENT);

  let order = 0;
  const add = <T extends THREE.Object3D>(object: T): T => {
    object.frustumCulled = false;
    object.renderOrder = order++;
    object.visible = false;
    group.add(object);
    return object;
  };
  const empty = (): THREE.BufferGeometry => new THREE.BufferGeometry();
  const land = add(new THREE.Mesh(empty(), landMaterial));
  const core = add(new THREE.Mesh(empty(), coreMaterial));
  const buffer = add(new THREE.Mesh(empty(), bufferMaterial));
  const cells = add(new THREE.Mesh(empty(), cellMaterial));
  // over the elements, so that the coast is seen through the mesh
  const shore = add(new THREE.LineSegments(empty(), shoreMaterial));
  const edges = add(new THREE.LineSegments(empty(), edgeMaterial));
  const place = add(new THREE.Mesh(empty(), placeMaterial));
  const outline = add(new LineSegments2(new LineSegmentsGeometry(), outlineMaterial));
  const boundary = add(new LineSegments2(new LineSegmentsGeometry(), boundaryMaterial));
  const points = add(new THREE.Points(empty(), pointMaterial));
  const limiting = add(new THREE.Points(empty(), limitMaterial));
  const placePoints = add(new THREE.Points(empty(), placePointMaterial));
  const cursor = add(new THREE.Points(empty(), cursorMaterial));

  let layers: LayerChoice = { elements: true, observations: true, spacing: false, effect: true, land: true };
  const has = { mesh: false, points: false, cells: false, land: false, limiting: false };
  let medianEdge = 1;
  let pixels = 1;
  let zoomNow = 1;

  const show = (): void => {
    land.visible = shore.visible = has.land && layers.land;
    core.visible = buffer.visible = has.mesh && layers.elements;
    edges.visible = has.mesh && layers.elements;
    outline.visible = boundary.visible = has.mesh;
    cells.visible = has.cells && layers.spacing;
    points.visible = has.points && (layers.observations || layers.effect);
    limiting.visible = has.limiting && layers.effect;
    requestFrame();
  };

  const replace = (object: THREE.Mesh | THREE.LineSegments | THREE.Points, attributes: Record<string, THREE.BufferAttribute>, index?: THREE.BufferAttribute): void => {
    object.geometry.dispose();
    const geometry = new THREE.BufferGeometry();
    for (const [name, attribute] of Object.entries(attributes)) geometry.setAttribute(name, attribute);
    if (index) geometry.setIndex(index);
    object.geometry = geometry;
  };
  const positionsOf = (pairs: Float32Array): { position: THREE.BufferAttribute } => ({ position: new THREE.BufferAttribute(lift(pairs), 3) });
  const setThick = (object: LineSegments2, segments: Float32Array): void => {
    object.geometry.dispose();
    const geometry = new LineSegmentsGeometry();
    if (segments.length > 0) geometry.setPositions(lift(segments));
    object.geometry = geometry;
  };
  const plainPoints = (pairs: Float32Array): Record<string, THREE.BufferAttribute> => ({
    ...positionsOf(pairs),
    share: new THREE.BufferAttribute(new Float32Array(pairs.length / 2).fill(-1), 1),
  });
  const pointSize = (): void => {
    const near = Math.min(1, Math.max(0, Math.log2(Math.max(zoomNow * medianEdge, 1) / 6) / 3));
    pointMaterial.uniforms.size.value = (4 + 5 * near) * pixels;
    limitMaterial.uniforms.size.value = 30 * pixels;
    placePointMaterial.uniforms.size.value = 24 * pixels;
    cursorMaterial.uniforms.size.value = 22 * pixels;
  };

  return {
    group,
    setMesh(mesh) {
      has.mesh = mesh !== null;
      if (mesh) {
        // one position buffer is shared by elements of both kinds and edges
        const attributes = positionsOf(mesh.positions);
        replace(core, attributes, new THREE.BufferAttribute(mesh.core, 1));
        replace(buffer, attributes, new THREE.BufferAttribute(mesh.buffer, 1));
        replace(edges, attributes, new THREE.BufferAttribute(mesh.edges, 1));
        setThick(outline, mesh.outline);
        setThick(boundary, mesh.boundary);
        medianEdge = typicalEdge(mesh);
        pointSize();
      }
      show();
    },
    setPoints(next) {
      has.points = next !== null;
      if (next) {
        const { positions, share } = next;
        replace(points, share ? { ...positionsOf(positions), share: new THREE.BufferAttribute(share, 1) } : plainPoints(positions));
      }
      show();
    },
    setCells(next) {
      has.cells = next !== null;
      if (next) replace(cells, fanTriangles(next));
      show();
    },
    setLand(next) {
      has.land = next !== null && next.triangles.length > 0;
      if (next && has.land) {
        replace(land, positionsOf(next.triangles));
        replace(shore, positionsOf(next.shore));
      }
      show();
    },
    setLimiting(position) {
      has.limiting = position !== null;
      if (position) replace(limiting, plainPoints(Float32Array.from(position)));
      show();
    },
    setPlace(next) {
      place.visible = next !== null && next.triangles.length > 0;
      placePoints.visible = next !== null && next.points.length > 0;
      if (next && place.visible) replace(place, positionsOf(next.triangles));
      if (next && placePoints.visible) replace(placePoints, plainPoints(next.points));
      requestFrame();
    },
    setCursor(position) {
      cursor.visible = position !== null;
      // a moved object keeps its one uploaded point
      if (position && !cursor.geometry.getAttribute('position')) replace(cursor, plainPoints(new Float32Array(2)));
      if (position) cursor.position.set(position[0], position[1], 0);
      requestFrame();
    },
    setLayers(next) {
      layers = next;
      show();
    },
    setTheme({ token, scale }) {
      scaleTexture.image.data?.set(scale);
      scaleTexture.needsUpdate = true;
      landMaterial.color.set(token['walnut-wash']);
      shoreMaterial.color.set(token.walnut);
      coreMaterial.color.set(token['woad-wash']);
      bufferMaterial.color.set(token['weld-wash']);
      edgeMaterial.color.set(token['ink-soft']);
      outlineMaterial.color.set(token.woad);
      boundaryMaterial.color.set(token.madder);
      placeMaterial.color.set(token.madder);
      const set = (material: THREE.ShaderMaterial, plain: string, rim: string): void => {
        // shaders write the display's colours as they are
        material.uniforms.plain.value.setStyle(plain, THREE.LinearSRGBColorSpace);
        material.uniforms.rim.value.setStyle(rim, THREE.LinearSRGBColorSpace);
        material.uniforms.beyond.value.setStyle(token.madder, THREE.LinearSRGBColorSpace);
      };
      set(pointMaterial, token.woad, token['linen-raised']);
      set(limitMaterial, token.madder, token['linen-raised']);
      set(placePointMaterial, token.madder, token['linen-raised']);
      set(cursorMaterial, token.ink, token['linen-raised']);
      // a point's rim stands out from its fill and from the elements around it
      pointMaterial.uniforms.rim.value.setStyle(token.ink, THREE.LinearSRGBColorSpace);
      requestFrame();
    },
    setZoom(zoom, pixelRatio) {
      zoomNow = zoom;
      pixels = pixelRatio;
      edgeMaterial.opacity = Math.min(0.62, Math.max(0.06, (zoom * medianEdge) / 28));
      pointSize();
    },
    destroy() {
      group.traverse((object) => {
        if (object instanceof THREE.Mesh || object instanceof THREE.LineSegments || object instanceof THREE.Points) {
          object.geometry.dispose();
          (object.material as THREE.Material).dispose();
        }
      });
      scaleTexture.dispose();
    },
  };
};

/** Median length of a sample of edges, map kilometres. */
const typicalEdge = ({ positions: p, edges }: MeshBuffers): number => {
  const count = edges.length / 2;
  const every = Math.max(1, Math.floor(count / 500));
  const lengths: number[] = [];
  for (let k = 0; k < count; k += every) {
    const a = 2 * edges[2 * k], b = 2 * edges[2 * k + 1];
    lengths.push(Math.hypot(p[a] - p[b], p[a + 1] - p[b + 1]));
  }
  lengths.sort((x, y) => x - y);
  return lengths[lengths.length >> 1] || 1;
};

const fanTriangles = ({ start, positions, share }: CellBuffers): Record<string, THREE.BufferAttribute> => {
  const xyz: number[] = [];
  const shares: number[] = [];
  for (let i = 0; i + 1 < start.length; i++) {
    const first = start[i];
    for (let k = first + 1; k + 1 < start[i + 1]; k++)
      for (const corner of [first, k, k + 1]) {
        xyz.push(positions[2 * corner], positions[2 * corner + 1], 0);
        shares.push(share[i]);
      }
  }
  return { position: new THREE.BufferAttribute(Float32Array.from(xyz), 3), share: new THREE.BufferAttribute(Float32Array.from(shares), 1) };
};
