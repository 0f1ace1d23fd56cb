// What the program hands to the page. Frames are records of schema focusfall.frame/1 whose absent values were left
// out; a few keys beside them belong to the page alone.

export interface Valued {
  value?: number;
  low?: number;
  high?: number;
  at_infinity?: boolean;
  stale?: boolean;
  source?: string;
}

export interface Capture {
  camera?: string;
  lens?: string;
  body_serial?: string;
  lens_serial?: string;
  taken_at?: string;
  sequence?: number;
  focal_length_mm?: number;
  f_number?: number;
  exposure_time_s?: number;
  iso_speed?: number;
  exposure_bias_ev?: number;
  brightness_apex?: number;
  exposure_mode?: string;
  focus_distance_m?: Valued;
  pixel_pitch_um?: Valued;
  width_px?: number;
  height_px?: number;
  orientation?: number;
  flash_fired?: boolean;
  stabiliser_on?: boolean;
  focus_mode?: string;
  source?: Record<string, string>;
}

export interface Prediction {
  distance_from?: string;
  acceptable_blur_px?: number;
  acceptable_blur_um?: number;
  circle_of_confusion_um?: number;
  image_distance_mm?: number;
  entrance_pupil_mm?: number;
  magnification?: number;
  working_f_number?: number;
  hyperfocal_m?: number;
  near_limit_m?: number;
  far_limit_m?: number;
  far_limit_infinite?: boolean;
  depth_of_focus_um?: number;
  airy_diameter_px?: number;
  motion_blur_px?: number;
  baseline_px2?: Valued;
  blur_disc_px?: number;
  edge_rise_px?: number;
  exposure_value?: number;
  mid_tone_level?: number;
}

export interface Box {
  x: number;
  y: number;
  width: number;
  height: number;
}

export interface Aim extends Box {
  source?: string;
  grown?: boolean;
  mixed?: boolean;
}

export interface Blur {
  blur_disc_px?: number;
  low?: number;
  high?: number;
  squared_disc_px2?: number;
  edge_rise_px?: number;
  mtf50_cycles_per_px?: number;
  edges?: number;
  evidence?: boolean;
  bound?: string;
}

export interface Motion {
  length_px?: number;
  length_low?: number;
  length_high?: number;
  angle_deg?: number;
}

export interface Plane {
  x_gradient: number;
  y_gradient: number;
  offset_px?: number;
  contact?: string;
  contact_x?: number;
  contact_y?: number;
  at_contact_px?: number;
  at_contact_low?: number;
  at_contact_high?: number;
  inlier_fraction?: number;
  near_side?: string;
}

export interface Clipping {
  red?: number;
  green?: number;
  blue?: number;
  any?: number;
  aim_any?: number;
  largest_patch?: number;
  kind?: string;
  measured_on?: string;
}

export interface Measurement {
  aim?: Blur;
  best?: Blur & Partial<Box>;
  motion?: Motion;
  background_motion?: Motion;
  plane?: Plane;
  clipping?: Clipping;
  shadows?: { any?: number };
  tone?: { mean_linear?: number; median_linear?: number; aim_median_linear?: number; p99_linear?: number };
}

export interface Verdict {
  focus?: string;
  causes?: string[];
  panned?: boolean;
  defocus_um?: number;
  defocus_um_low?: number;
  defocus_um_high?: number;
  defocus_limits?: number;
  defocus_limits_low?: number;
  defocus_limits_high?: number;
  focus_offset_m?: number;
  focus_offset_m_low?: number;
  focus_offset_m_high?: number;
  exposure?: string;
  exposure_error_ev?: number;
  exposure_error_ev_low?: number;
  exposure_error_ev_high?: number;
  clipped?: boolean;
  pull_back_ev?: number;
  summary?: string;
}

export interface Issue {
  stage: string;
  code: string;
  message: string;
}

// The map of blur, one octet a tile in base64: 0 no evidence, else blur_px = 2^((octet - 1) / 40) - 1.
export interface Tiles {
  rows: number;
  columns: number;
  blur: string;
  clipped: string; // 0..255 of the tile
}

export interface Frame {
  path: string;
  capture?: Capture;
  prediction?: Prediction;
  aim?: Aim;
  measurement?: Measurement;
  verdict?: Verdict;
  issues?: Issue[];
  tiles?: Tiles;
  decision?: Decision;
}

export interface Decision {
  decision: string; // keeper, spare, miss
  reason?: string;
  burst?: number;
  by_person?: boolean;
  note?: string;
}

export interface PageData {
  title: string;
  version: string;
  review?: boolean;
  frames: Frame[];
  lens?: unknown[];
  exposure?: unknown[];
}

// Pictures of a frame as base64 JPEG, upright; empty where there is none.
export interface Pictures {
  whole: string;
  aim: string;
}

const element = (id: string): HTMLElement => {
  const found = document.getElementById(id);
  if (!found) throw new Error(`the page has no ${id}`);
  return found;
};

export const readData = (): PageData => JSON.parse(element("data").textContent ?? "") as PageData;

// One line a frame, "whole,aim". Split once; decoding is left to the browser when an image is shown.
let pictureLines: string[] | undefined;
export const picturesOf = (index: number): Pictures => {
  pictureLines ??= (element("pictures").textContent ?? "").split("\n");
  const [whole = "", aim = ""] = (pictureLines[index] ?? "").split(",");
  return { whole, aim };
};

export const blurOfOctet = (octet: number): number | undefined =>
  octet === 0 ? undefined : 2 ** ((octet - 1) / 40) - 1;

export const octets = (base64: string): Uint8Array => Uint8Array.from(atob(base64), (c) => c.charCodeAt(0));

export const acceptablePx = (frame: Frame): number | undefined => frame.prediction?.acceptable_blur_px;

// Blur at the aim in limits of the depth of field, without a side.
export const limitsAtAim = (frame: Frame): number | undefined => {
  const blur = frame.measurement?.aim?.blur_disc_px;
  const limit = acceptablePx(frame);
  return blur === undefined || !limit ? undefined : blur / limit;
};

export const fileName = (path: string): string => path.slice(path.lastIndexOf("/") + 1);

export const focusWord = (frame: Frame): string => frame.verdict?.focus ?? "not done";

export const causesOf = (frame: Frame): string[] => {
  const causes = [...(frame.verdict?.causes ?? [])];
  if (frame.verdict?.clipped) causes.push("clipped");
  return causes;
};
