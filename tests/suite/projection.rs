//! Map projection against published points and independent computations.
//!
//! Not applicable here: the points on OSGB36 (Guidance Note 7-2 and Ordnance Survey guide) and on Clarke 1866 (Snyder,
//! PP 1395), because those datums are refused as working frames.

use fixability::frame::{Frame, FrameError, GeoPoint, LocalPoint};

fn dms(d: f64, m: f64, s: f64) -> f64 {
    d.signum() * (d.abs() + m / 60.0 + s / 3600.0)
}

#[track_caller]
fn lands_on(frame: &Frame, lat_deg: f64, lon_deg: f64, east_m: f64, north_m: f64, within_m: f64) {
    let p = frame.to_local(GeoPoint { lat_deg, lon_deg }).expect("a position inside the grid");
    let published = LocalPoint::new(east_m, north_m);
    let off = p.distance_m(published);
    assert!(off <= within_m, "{p:?} is {off} m from the published {published:?}");
    let back = frame.to_geo(p).expect("a position inside the grid");
    assert!((back.lat_deg - lat_deg).abs() < 1e-11 && (back.lon_deg - lon_deg).abs() < 1e-11, "{back:?}");
}

#[test]
fn gda_manual_flinders_peak() {
    // Geocentric Datum of Australia technical manual: Flinders Peak, MGA zone 55, with scale and convergence (second-hand).
    let frame = Frame::from_epsg(28355).unwrap();
    let (lat, lon) = (dms(-37.0, 57.0, 3.7203), dms(144.0, 25.0, 29.5244));
    lands_on(&frame, lat, lon, 273741.297, 5796489.777, 1e-3);
    let p = frame.to_local(GeoPoint { lat_deg: lat, lon_deg: lon }).unwrap();
    let d = frame.distortion(&[p]).unwrap().unwrap();
    assert!((d.scale_min - 1.00023056).abs() < 1e-8 && (d.scale_max - 1.00023056).abs() < 1e-8, "{d:?}");
    // The manual gives grid convergence 1°35′03.65″ as the angle from true to grid north counted so that, west of the
    // meridian in the south, grid north lies east of true north.
    let published = dms(1.0, 35.0, 3.65).to_radians();
    assert!((d.convergence_min_rad - published).abs() < 1e-7, "{d:?}");
    assert!(d.shear_max_rad < 1e-8, "{d:?}");
}

#[test]
fn gda_manual_buninyong() {
    // Same manual: Buninyong, MGA zone 54 (second-hand).
    let frame = Frame::from_epsg(28354).unwrap();
    lands_on(&frame, dms(-37.0, 39.0, 10.1561), dms(143.0, 55.0, 35.3839), 758173.797, 5828674.340, 1e-3);
}

#[test]
fn mga2020_zone_50() {
    // MGA2020 worked example, zone 50 (second-hand).
    let frame = Frame::from_epsg(7850).unwrap();
    lands_on(&frame, dms(-32.0, 2.0, 7.16398), dms(115.0, 45.0, 12.74082), 382306.176, 6454969.831, 1e-3);
}

#[test]
fn utm_32_north() {
    // 55° N 12° E in WGS 84 / UTM 32N, test value of a projection library (second-hand).
    let frame = Frame::from_epsg(32632).unwrap();
    lands_on(&frame, 55.0, 12.0, 691875.632137542, 6098907.825129169, 1e-6);
}

#[test]
fn laea_europe() {
    // IOGP Guidance Note 7-2, Lambert Azimuthal Equal Area, ETRS89 / LAEA Europe; printed to 1 cm.
    let frame = Frame::from_epsg(3035).unwrap();
    lands_on(&frame, 50.0, 5.0, 3962799.45, 2999718.85, 1e-2);
    let p = LocalPoint::new(3962799.45, 2999718.85);
    // Equal area: the product of the two scales is 1 (definition of the projection).
    let d = frame.distortion(&[p]).unwrap().unwrap();
    assert!((d.scale_min * d.scale_max - 1.0).abs() < 1e-8, "{d:?}");
    assert!(d.scale_max - d.scale_min > 1e-4 && d.shear_max_rad > 5e-5, "{d:?}");
}

#[test]
fn thousand_points_in_their_own_zone() {
    // tests/data/projection/utm1000.csv, see its SOURCE.md: pyproj 3.7.2 (PROJ 9.5.1). Limit 1 mm; measured 1e-6 mm scale.
    let text = include_str!("../data/projection/utm1000.csv");
    let mut checked = 0;
    let mut worst = 0.0_f64;
    for line in text.lines() {
        let f: Vec<f64> = line.split(',').map(|t| t.trim().parse().unwrap()).collect();
        let geo = GeoPoint { lat_deg: f[0], lon_deg: f[1] };
        let frame = Frame::from_epsg(f[6] as u16).unwrap();
        let p = frame.to_local(geo).unwrap();
        let back = frame.to_geo(LocalPoint::new(f[4], f[5])).unwrap();
        let off = p.distance_m(LocalPoint::new(f[4], f[5]));
        worst = if off > worst { off } else { worst };
        assert!((back.lat_deg - geo.lat_deg).abs() < 1e-9, "{line}");
        assert!(((back.lon_deg - geo.lon_deg) * geo.lat_deg.to_radians().cos()).abs() < 1e-9, "{line}");
        // The zone of the file is the zone the program picks, apart from the wider zones off Norway and Svalbard.
        let plain = !(56.0..64.0).contains(&geo.lat_deg) && geo.lat_deg < 72.0;
        assert!(!plain || Frame::utm_for(geo).unwrap().epsg() == Some(f[6] as u16), "{line}");
        checked += 1;
    }
    assert_eq!(checked, 1000);
    assert!(worst <= 1e-3, "worst {worst} m");
    assert!(worst <= 1e-6, "far better than required is usual; worst {worst} m");
}

#[test]
fn transverse_mercator_test_set() {
    // tests/data/projection/tmcoords_258.dat, see its SOURCE.md: C. Karney's test set, values to 1e-9 m and better.
    let frame = Frame::transverse_mercator(0.0, 0.9996).unwrap();
    let (mut checked, mut refused) = (0, 0);
    for line in include_str!("../data/projection/tmcoords_258.dat").lines() {
        let f: Vec<f64> = line.split_whitespace().map(|t| t.parse().unwrap()).collect();
        let geo = GeoPoint { lat_deg: f[0], lon_deg: f[1] };
        if f[1] > 10.0 {
            assert!(matches!(frame.to_local(geo), Err(FrameError::FarFromMeridian { .. })), "{line}");
            refused += 1;
            continue;
        }
        let p = frame.to_local(geo).unwrap();
        assert!(p.distance_m(LocalPoint::new(f[2], f[3])) <= 1e-7, "{line}: {p:?}");
        if f[0] < 89.9 && f[1] < 9.99 {
            let d = frame.distortion(&[p]).unwrap().unwrap();
            // Scale over 100 m instead of a point; the second derivative over 50 m is below 1e-10.
            assert!((d.scale_max - f[5]).abs() < 2e-8 && (d.scale_min - f[5]).abs() < 2e-8, "{line}: {d:?}");
            // The file counts the convergence clockwise from true to grid north, positive east of the meridian.
            assert!((d.convergence_min_rad - f[4].to_radians()).abs() < 1e-7, "{line}: {d:?}");
        }
        checked += 1;
    }
    assert!(checked >= 20 && checked + refused == 258, "{checked} checked, {refused} refused");
}

#[test]
fn wider_zones_off_norway_and_svalbard() {
    // The exceptions of the UTM grid: zone 32 from 3° E between 56° and 64° N; zones 31, 33, 35, 37 from 72° N (from memory).
    for (lat_deg, lon_deg, code) in [
        (60.0, 5.3, 32632),
        (60.0, 2.9, 32631),
        (78.0, 15.6, 32633),
        (78.0, 8.9, 32631),
        (78.0, 33.5, 32637),
        (-33.0, 18.4, 32734),
        (10.0, 180.0, 32601),
        (10.0, -180.0, 32601),
        (10.0, 179.999, 32660),
    ] {
        assert_eq!(
            Frame::utm_for(GeoPoint { lat_deg, lon_deg }).unwrap().epsg(),
            Some(code),
            "{lat_deg} {lon_deg}"
        );
    }
}

#[test]
fn limits_are_stated() {
    let zone = Frame::from_epsg(32631).unwrap();
    let at = |lat_deg, lon_deg| GeoPoint { lat_deg, lon_deg };
    assert!(matches!(zone.to_local(at(84.5, 3.0)), Err(FrameError::OutsideUtm { .. })));
    assert!(matches!(zone.to_local(at(50.0, 13.5)), Err(FrameError::FarFromMeridian { .. })));
    assert!(matches!(zone.to_local(at(f64::NAN, 3.0)), Err(FrameError::NotOnEarth { .. })));
    assert!(matches!(zone.to_local(at(91.0, 3.0)), Err(FrameError::NotOnEarth { .. })));
    assert!(zone.to_geo(LocalPoint::new(5e7, 6e6)).is_err());
    assert!(Frame::utm_for(at(85.0, 0.0)).is_err());
    assert!(matches!(Frame::local().to_geo(LocalPoint::new(0.0, 0.0)), Err(FrameError::LocalHasNoEarth)));
    assert!(Frame::local().distortion(&[LocalPoint::new(0.0, 0.0)]).unwrap().is_none());
    assert!(matches!(Frame::from_epsg(27700), Err(FrameError::OtherDatum { .. })));
    assert!(matches!(Frame::from_epsg(4326), Err(FrameError::NotProjected { .. })));
    // A polar grid takes the place of UTM beyond its ends.
    let polar = Frame::from_epsg(5041).unwrap();
    let p = polar.to_local(at(88.0, 40.0)).unwrap();
    let back = polar.to_geo(p).unwrap();
    assert!((back.lat_deg - 88.0).abs() < 1e-10 && (back.lon_deg - 40.0).abs() < 1e-9, "{back:?}");
}

#[test]
fn distortion_of_an_area_holds_that_of_every_position_in_it() {
    let frame = Frame::from_epsg(32631).unwrap();
    // The central meridian, where the scale is smallest, lies inside the box but on no point of its lattice.
    let (low, high) = (LocalPoint::new(480_000.0, 6_200_000.0), LocalPoint::new(550_000.0, 6_240_000.0));
    let area = frame.distortion(&[low, high]).unwrap().unwrap();
    for i in 0..=70 {
        for j in 0..=4 {
            let p =
                LocalPoint::new(low.east_m + f64::from(i) * 1000.0, low.north_m + f64::from(j) * 10_000.0);
            let here = frame.distortion(&[p]).unwrap().unwrap();
            assert!(
                here.scale_min >= area.scale_min - 1e-9 && here.scale_max <= area.scale_max + 1e-9,
                "{p:?}"
            );
            assert!(here.convergence_min_rad >= area.convergence_min_rad - 1e-9);
            assert!(here.convergence_max_rad <= area.convergence_max_rad + 1e-9);
        }
    }
}
