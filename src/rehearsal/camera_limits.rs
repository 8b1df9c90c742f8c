//! What a scene may ask of the camera, the clock and the codec.
use super::RehearsalError;
use super::error::{require, within};
use super::scene::{CameraScene, Scene};
use super::shutter;
use super::storage::{CodecName, CodecScene, PixelFormat};

/// Largest side of a picture, px: what H.264 and the common players can do.
const LARGEST_SIDE_PX: u32 = 8192;
/// Most pictures in a film: a quarter of an hour at 240 Hz.
const MOST_PICTURES: f64 = 216_000.0;
/// Most periods in a film: integrated laws keep 64 polynomials a period, 10 kB.
const MOST_PERIODS: f64 = 5000.0;

pub(super) fn check_camera(camera: &CameraScene) -> Result<(), RehearsalError> {
    let sides = "give an even number of pixels from 32 to 8192";
    for (key, side) in [
        ("camera.width_px", camera.width_px),
        ("camera.height_px", camera.height_px),
    ] {
        require(
            (32..=LARGEST_SIDE_PX).contains(&side) && side.is_multiple_of(2),
            key,
            side,
            sides,
        )?;
    }
    let [wide, high] = camera.pixel_aspect;
    let aspect = "give [numerator, denominator], each from 1 to 255, that divides the width into an even number of stored pixels, and no rotation by 90 or 270";
    let found = format!("{wide}/{high}");
    let divides = (1..=255).contains(&wide)
        && (1..=255).contains(&high)
        && (camera.width_px * high).is_multiple_of(2 * wide);
    let stored = if divides {
        camera.width_px * high / wide
    } else {
        0
    };
    let turned = !camera.rotation_deg.is_multiple_of(180) && wide != high;
    require(
        (32..=LARGEST_SIDE_PX).contains(&stored) && !turned,
        "camera.pixel_aspect",
        found,
        aspect,
    )?;
    require(
        [0, 90, 180, 270].contains(&camera.rotation_deg),
        "camera.rotation_deg",
        camera.rotation_deg,
        "give 0, 90, 180 or 270",
    )?;
    within(
        "camera.px_per_m",
        camera.px_per_m,
        1.0,
        1e6,
        "give pixels a metre from 1 to 1000000",
    )?;
    within(
        "camera.axis_angle_deg",
        camera.axis_angle_deg,
        -180.0,
        180.0,
        "give degrees from -180 to 180",
    )?;
    for centre in camera.centre_px.iter().flatten() {
        within(
            "camera.centre_px",
            *centre,
            -8192.0,
            16384.0,
            "give [x, y] in pixels near the picture",
        )?;
    }
    check_light(camera)
}

/// Blur, grain, lamp and shake.
fn check_light(camera: &CameraScene) -> Result<(), RehearsalError> {
    within(
        "camera.blur_px",
        camera.blur_px,
        0.0,
        10.0,
        "give pixels from 0 to 10",
    )?;
    within(
        "camera.noise_grey",
        camera.noise_grey,
        0.0,
        64.0,
        "give grey levels from 0 to 64",
    )?;
    within(
        "camera.shot_grey",
        camera.shot_grey,
        0.0,
        16.0,
        "give grey levels from 0 to 16",
    )?;
    within(
        "camera.brightness_drift",
        camera.brightness_drift,
        -0.9,
        2.0,
        "give a relative change from -0.9 to 2",
    )?;
    within(
        "camera.shake_px",
        camera.shake_px,
        0.0,
        32.0,
        "give pixels from 0 to 32",
    )?;
    if let Some(flicker) = camera.flicker {
        within(
            "camera.flicker.amplitude",
            flicker.amplitude,
            0.0,
            0.9,
            "give a relative amplitude from 0 to 0.9",
        )?;
        within(
            "camera.flicker.frequency_hz",
            flicker.frequency_hz,
            0.0,
            1000.0,
            "give hertz from 0 to 1000",
        )?;
    }
    Ok(())
}

pub(super) fn check_time(scene: &Scene) -> Result<(), RehearsalError> {
    let camera = &scene.camera;
    let rate = camera.rate_hz.fraction();
    let found = format!("{:?}", camera.rate_hz);
    let rate_hz = rate.map_or(f64::NAN, |[num, den]| f64::from(num) / f64::from(den));
    require(
        (1.0..=1000.0).contains(&rate_hz),
        "camera.rate_hz",
        found,
        "give hertz from 1 to 1000, as a number or [numerator, denominator]",
    )?;
    if let Some(capture_fps) = scene.codec.capture_fps {
        within(
            "codec.capture_fps",
            capture_fps,
            rate_hz,
            10_000.0,
            "give hertz from camera.rate_hz to 10000",
        )?;
    }
    let taken_hz = scene.codec.capture_fps.unwrap_or(rate_hz);
    within(
        "camera.duration_s",
        camera.duration_s,
        1.0 / taken_hz,
        3600.0,
        "give seconds from one frame interval to 3600",
    )?;
    let pictures = camera.duration_s * taken_hz;
    require(
        pictures <= MOST_PICTURES,
        "camera.duration_s",
        camera.duration_s,
        "the film would have more than 216000 pictures: make it shorter or slower",
    )?;
    let periods = camera.duration_s / scene.motion.period_s;
    require(
        periods <= MOST_PERIODS,
        "camera.duration_s",
        camera.duration_s,
        "the film would hold more than 5000 periods: make it shorter",
    )?;
    check_shutter(scene, taken_hz)?;
    let ticks = scene
        .stamps
        .ticks_per_s
        .unwrap_or(shutter::FINE_TICKS_PER_S);
    require(
        (1..=10_000_000).contains(&ticks) && f64::from(ticks) >= rate_hz,
        "stamps.ticks_per_s",
        ticks,
        "give a whole number from camera.rate_hz to 10000000",
    )
}

/// Exposure, readout and jitter against the time a picture has.
fn check_shutter(scene: &Scene, taken_hz: f64) -> Result<(), RehearsalError> {
    let camera = &scene.camera;
    for (key, seconds) in [
        ("camera.exposure_s", camera.exposure_s),
        ("camera.readout_s", camera.readout_s),
    ] {
        within(
            key,
            seconds,
            0.0,
            1.0 / taken_hz,
            "give seconds from 0 to one frame interval",
        )?;
    }
    // The smear is sampled every quarter pixel, for every pixel of the body: this bounds the work.
    let smear_px = scene.motion.amplitude_m * std::f64::consts::TAU / scene.motion.period_s
        * camera.exposure_s
        * camera.px_per_m;
    require(
        smear_px <= 256.0,
        "camera.exposure_s",
        camera.exposure_s,
        "the marker would be smeared over more than 256 px: expose for less",
    )?;
    within(
        "stamps.jitter_s",
        scene.stamps.jitter_s,
        0.0,
        0.2 / taken_hz,
        "give seconds from 0 to a fifth of the frame interval",
    )
}

pub(super) fn check_codec(codec: &CodecScene, camera: &CameraScene) -> Result<(), RehearsalError> {
    let rate = codec.bit_rate.unwrap_or(1_000_000);
    require(
        (1000..=1_000_000_000).contains(&rate),
        "codec.bit_rate",
        rate,
        "give bits a second from 1000 to 1000000000",
    )?;
    let crf = codec.crf.unwrap_or(1);
    require(
        crf <= 63 && (codec.bit_rate.is_none() || codec.crf.is_none()),
        "codec.crf",
        crf,
        "give 0 to 63, and not together with bit_rate",
    )?;
    require(
        (1..=10_000).contains(&codec.gop),
        "codec.gop",
        codec.gop,
        "give 1 to 10000 pictures",
    )?;
    require(
        codec.b_frames <= 16,
        "codec.b_frames",
        codec.b_frames,
        "give 0 to 16 pictures",
    )?;
    let reorders = matches!(
        codec.name,
        CodecName::H264 | CodecName::Hevc | CodecName::Mpeg4
    );
    require(
        codec.b_frames == 0 || reorders,
        "codec.b_frames",
        codec.b_frames,
        "this codec has none: give 0, or take h264, hevc or mpeg4",
    )?;
    require(
        (1..=16).contains(&codec.threads),
        "codec.threads",
        codec.threads,
        "give 1 to 16",
    )?;
    let format = codec.layout();
    let fits = match codec.name {
        CodecName::Mjpeg => matches!(format, PixelFormat::Yuvj420p | PixelFormat::Yuvj422p),
        CodecName::Prores => format == PixelFormat::Yuv422p10,
        CodecName::Mpeg4 => format == PixelFormat::Yuv420p,
        CodecName::H264 => true,
        CodecName::Hevc => !matches!(format, PixelFormat::Yuvj420p | PixelFormat::Yuvj422p),
        CodecName::Vp9 => matches!(
            format,
            PixelFormat::Yuv420p
                | PixelFormat::Yuv422p
                | PixelFormat::Yuv420p10
                | PixelFormat::Yuv422p10
        ),
    };
    require(
        fits,
        "codec.pixel_format",
        format!("{format:?}").to_lowercase(),
        "this codec cannot store it: leave it out for the usual one",
    )?;
    let pixels = u64::from(camera.width_px) * u64::from(camera.height_px);
    require(
        pixels <= 36_000_000,
        "camera.width_px",
        camera.width_px,
        "the picture would have more than 36 million pixels: make it smaller",
    )
}
