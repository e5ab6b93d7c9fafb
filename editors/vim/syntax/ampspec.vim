" Colours for ampspec files. The words come from the vocabulary: a test writes them.
if exists('b:current_syntax')
  finish
endif
setlocal iskeyword+=-
" BEGIN WORDS
syntax keyword ampspecWord across across-load air all-channels authorised bank base because below board both-emitters both-halves bridge bridged brushed build by bypass centre-tapped-total channel chassis coil common-emitter compensation complementary compound-pair cooler crest damp dc device driver drop electrical emitter emitter-follower enclosed energy error esr fast from from-rail full full-load gap grounded height held high horizontal hot idle information lateral length life life-at loaded loop lossy low-mains mains mechanical melts minimum nmos no no-load nominal-mains none npn ntc of on one-channel open open-market output part peak per pmos pnp primary pulse qty rail range ref release ripple secondary sense series shunt sink slow source-follower speaker stage supply surge tap tested thermal-fuse thick to-base touchable transformer typical until vertical warning watches width winding yes
syntax keyword ampspecKey allow ambient amplifier angle band base base-emitter bleeder board-reservoir builds change channels channels-per-board coil connection contacts crowbar current curve cutout dc detector detector-time devices driver driver-rail drop duty emitter enclosure endurance fins foster fuse gain gate-drift gate-source gate-zener heatsink hfe idle insulator junction junction-case limit-line limiter limiter-break loads mains mass minimum muting network nominal on-resistance output output-current own-sink pairs parallel part plate policy power predriver primary protection rails rated rating rectifier regulation relay replace reservoir resistance resistive resonance second-breakdown secondary sensor severity soa soft-start source spread-across-sink structure supply survives-short switch table tail terminals thermal-fuse touchable transformer transition vbe vbe-spread vceo vdss vgs voice-coil voltage-amplifier wiring zobel
syntax keyword ampspecKind alternate amplifier ampspec build device heatsink load network policy protection stage supply transformer use waive
" END WORDS
syntax match ampspecNumber /\v<[+-]?\.?\d\S{-}\ze($|[ ,}])/
syntax region ampspecText start=/"/ end=/"/ oneline
syntax match ampspecComment /#.*/
highlight default link ampspecKind Keyword
highlight default link ampspecKey Identifier
highlight default link ampspecWord Constant
highlight default link ampspecNumber Number
highlight default link ampspecText String
highlight default link ampspecComment Comment
let b:current_syntax = 'ampspec'
