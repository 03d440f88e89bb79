// Compares `turnwright sample` on glTF files with the loader and the animation mixer of the npm package `three`.
//
// usage: node gltf_check.mjs TURNWRIGHT FILE...
//
// Every clip of every file is sampled at many times, local and world; prints the largest difference for each file and
// exits 1 above tolerance. Images and materials are taken out before loading: the loader needs a browser for them.

import { execFileSync } from 'node:child_process';
import { readFileSync } from 'node:fs';
import { createRequire } from 'node:module';
import { dirname, join } from 'node:path';
import { pathToFileURL } from 'node:url';

// The packages lie under target/outside, not beside this script.
const require = createRequire(pathToFileURL(join(process.cwd(), 'target/outside/package.json')));
const three = await import(pathToFileURL(require.resolve('three')));
const { GLTFLoader } = await import(pathToFileURL(require.resolve('three/addons/loaders/GLTFLoader.js')));

globalThis.self = globalThis;
globalThis.ProgressEvent ??= class { };

// Keys are float32: the mixer's own arithmetic is float32 too.
const TURN_DEG = 1e-3;
const PLACE_SHARE = 1e-5;

function withoutPictures(path) {
  const bytes = readFileSync(path);
  const isGlb = bytes.toString('latin1', 0, 4) === 'glTF';
  const jsonLength = isGlb ? bytes.readUInt32LE(12) : bytes.length;
  const json = JSON.parse(bytes.toString('utf8', isGlb ? 20 : 0, (isGlb ? 20 : 0) + jsonLength));
  for (const member of ['images', 'textures', 'materials', 'samplers']) delete json[member];
  for (const mesh of json.meshes ?? []) for (const part of mesh.primitives) delete part.material;
  const listed = (json.extensionsRequired ?? []).filter((name) => !/texture|material/i.test(name));
  if (json.extensionsRequired) json.extensionsRequired = listed;
  for (const buffer of json.buffers ?? []) {
    if (buffer.uri && !buffer.uri.startsWith('data:')) {
      const data = readFileSync(join(dirname(path), decodeURIComponent(buffer.uri)));
      buffer.uri = `data:application/octet-stream;base64,${data.toString('base64')}`;
    } else if (!buffer.uri && isGlb) {
      const data = bytes.subarray(20 + jsonLength + 8, 20 + jsonLength + 8 + buffer.byteLength);
      buffer.uri = `data:application/octet-stream;base64,${data.toString('base64')}`;
    }
  }
  return json;
}

function load(json) {
  return new Promise((resolve, reject) => new GLTFLoader().parse(JSON.stringify(json), '', resolve, reject));
}

/** The node a label of ours means: its name, `#INDEX` without one, `NAME#INDEX` where the name repeats. */
function nodeOf(label, nodes) {
  const numbered = /^(.*)#(\d+)$/s.exec(label);
  if (numbered && nodes[numbered[2]] && (nodes[numbered[2]].name ?? '') === numbered[1]) return Number(numbered[2]);
  const found = nodes.flatMap((node, index) => (node.name === label ? [index] : []));
  if (found.length !== 1) throw new Error(`label ${label} means ${found.length} nodes`);
  return found[0];
}

/** Keys off unit length are rotations of other lengths to this loader; the standard wants them unit, and we make them so. */
function makeUnit(clip) {
  for (const track of clip.tracks) {
    const keys = track.values.length / track.times.length / 4;
    if (!track.name.endsWith('.quaternion') || keys !== 1) continue;
    for (let i = 0; i < track.values.length; i += 4) {
      const length = Math.hypot(...track.values.subarray(i, i + 4));
      if (length > 0) for (let j = i; j < i + 4; j += 1) track.values[j] /= length;
    }
  }
}

function degreesBetween(a, b) {
  const difference = a.clone().invert().multiply(b);
  return (2 * Math.atan2(Math.hypot(difference.x, difference.y, difference.z), Math.abs(difference.w)) * 180) / Math.PI;
}

/**
 * An object's turn in the scene. Below an uneven size a turned joint is sheared, and a sheared matrix has no one turn in it: its columns
 * made unit, as `decompose` takes them, are not square, and putting its parts together again gives another matrix (11 degrees off for
 * a size of 1 to 1.4 and a turn of 30). There the turn is the product of the turns, which is what is sampled.
 */
function turnInScene(object) {
  const turn = new three.Quaternion(), place = new three.Vector3(), size = new three.Vector3();
  object.matrixWorld.decompose(place, turn, size);
  const again = new three.Matrix4().compose(place, turn, size).elements;
  const largest = Math.max(...object.matrixWorld.elements.map(Math.abs));
  const isSheared = object.matrixWorld.elements.some((own, i) => Math.abs(own - again[i]) > 1e-4 * largest);
  if (!isSheared) return [turn, place, false];
  turn.identity();
  for (let up = object; up; up = up.parent) turn.premultiply(up.quaternion);
  return [turn, place, true];
}

async function check(program, path) {
  const json = withoutPictures(path);
  const gltf = await load(json);
  const objects = new Map();
  gltf.scene.traverse((object) => {
    const index = gltf.parser.associations.get(object)?.nodes;
    // A node with a mesh of several parts is met again in its parts; the first is the node itself.
    if (index !== undefined && !objects.has(index)) objects.set(index, object);
  });
  let worstTurn = 0, worstPlace = 0, compared = 0, sheared = 0, worstAt = '';
  gltf.animations.forEach(makeUnit);
  for (const [number, clip] of gltf.animations.entries()) {
    // A clip whose channels all name no node is left out by the loader: then numbers would shift.
    if (gltf.animations.length !== (json.animations ?? []).length) throw new Error(`${path}: loader has other clips`);
    const times = [0, 0.01, ...Array.from({ length: 23 }, (_, i) => (clip.duration * (i + 0.37)) / 23)].filter((t) => t < clip.duration);
    for (const world of [false, true]) {
      const args = ['sample', `${path}#${number}`, '--format', 'json', '--at', times.join(','), ...(world ? ['--world'] : [])];
      const answer = JSON.parse(execFileSync(program, args, { maxBuffer: 1 << 30 }).toString());
      const mixer = new three.AnimationMixer(gltf.scene);
      const action = mixer.clipAction(clip);
      action.setLoop(three.LoopOnce);
      action.clampWhenFinished = true;
      action.play();
      times.forEach((time, at) => {
        mixer.setTime(time);
        gltf.scene.updateMatrixWorld(true);
        for (const [label, track] of Object.entries(answer.joints)) {
          const object = objects.get(nodeOf(label, json.nodes));
          if (!object) continue; // a joint outside the scene is not loaded
          const [turn, place, isSheared] = world ? turnInScene(object) : [object.quaternion.clone(), object.position, false];
          sheared += isSheared ? 1 : 0;
          const own = new three.Quaternion(...track.rotation[at]);
          const degrees = degreesBetween(own, turn.normalize());
          const share = place.distanceTo(new three.Vector3(...track.position[at])) / Math.max(1, place.length());
          if (degrees > worstTurn) { worstTurn = degrees; worstAt = `${clip.name} ${label} at ${time} s${world ? ' world' : ''}`; }
          worstPlace = Math.max(worstPlace, share);
          compared += 1;
        }
      });
      mixer.stopAllAction();
      mixer.uncacheRoot(gltf.scene);
    }
  }
  if (gltf.animations.length === 0) {
    console.log(`ok   ${path}: no clip, nothing to compare`);
    return true;
  }
  const good = worstTurn <= TURN_DEG && worstPlace <= PLACE_SHARE && compared > 0;
  const shear = sheared > 0 ? ` (${sheared} sheared)` : '';
  console.log(`${good ? 'ok  ' : 'FAIL'} ${path}: ${compared} joint-times${shear}, turn ${worstTurn.toExponential(1)} deg (${worstAt}), place ${worstPlace.toExponential(1)}`);
  return good;
}

const [program, ...paths] = process.argv.slice(2);
let failed = 0;
for (const path of paths) failed += (await check(program, path)) ? 0 : 1;
console.log(`${paths.length - failed} passed, ${failed} failed`);
process.exit(paths.length > 0 && failed === 0 ? 0 : 1);
